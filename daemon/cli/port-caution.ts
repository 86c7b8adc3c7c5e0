import { realpathSync } from "node:fs";
import { loadBench } from "./bench-text.ts";
import { EXIT, Trouble } from "./say.ts";
import { lives, notices } from "./where.ts";

/** What is to be said before a port is opened. */
export interface PortCaution {
  /** A sentence; empty where nothing is known to hang on the port's lines. */
  readonly words: string;
  /** Whether the lines must stay asserted when the port closes again. */
  readonly keepsLines: boolean;
}

/**
 * Looks, before a port is opened, whether that would touch a bench: a running one is refused, and a
 * bench file whose cut-off is a line of this port is told of.
 */
export function portCaution(path: string, file: string | undefined): PortCaution {
  const owner = notices().find((n) => lives(n) && n.port !== "" && real(n.port) === real(path));
  if (owner !== undefined) {
    throw new Trouble(
      `${path} is the port of bench ${owner.bench}, which runs (process ${owner.pid}).`,
      "End its daemon first: one host speaks to a board. Nothing was opened.",
      EXIT.outside,
    );
  }
  if (file === undefined) return { words: "", keepsLines: false };
  const { bench } = loadBench(file);
  const { transport, stream } = bench.controller;
  const cutOff = stream?.cutOff ?? null;
  const isPort = transport.kind === "serial" && real(transport.path) === real(path);
  if (!isPort || cutOff?.kind !== "line") return { words: "", keepsLines: false };
  const what =
    cutOff.mode === "static" ? "is now asserted, which cuts the light" : "is not toggled meanwhile";
  return {
    words: `Opening ${path}: its line ${cutOff.line.toUpperCase()} is the cut-off of bench ${bench.name} and ${what}.`,
    keepsLines: true,
  };
}

/** The device behind a name such as /dev/serial/by-id/…; the name itself where there is none. */
function real(path: string): string {
  try {
    return realpathSync(path);
  } catch {
    // Not there: opening it will say so.
    return path;
  }
}
