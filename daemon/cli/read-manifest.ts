import { LinkSession } from "../link/session.ts";
import { SerialTransport } from "../link/transports/serial.ts";
import { TcpTransport } from "../link/transports/tcp.ts";
import type { Transport } from "../link/transports/transport.ts";
import { channelNamed, type Manifest } from "../model/manifest.ts";
import { mono } from "../model/times.ts";
import type { Answers } from "./init-answers.ts";
import { EXIT, Trouble } from "./say.ts";

/** A board that boots first and is then asked eight times has answered by now, or never will. */
const INTRODUCTION_ms_MAX = 20_000;
/** How often overdue answers are looked for. */
const LOOK_ms = 50;

/** Asks the board on a port who it is, sends nothing else, and closes the port again. */
export async function readManifest(path: string, baud: number): Promise<Manifest> {
  const tcp = /^([A-Za-z0-9.-]+):(\d{1,5})$/.exec(path);
  const transport: Transport =
    tcp === null
      ? new SerialTransport({ path, baud })
      : new TcpTransport({ host: tcp[1] ?? "", port: Number(tcp[2]) });
  const session = new LinkSession({ serial: null, curve: () => null });
  const now = () => mono(performance.now());
  let timer: NodeJS.Timeout | undefined;
  try {
    return await new Promise<Manifest>((resolve, reject) => {
      const fail = (why: string): void =>
        reject(new Trouble(why, "See beamsitter ports, or answer by hand without --port."));
      const pump = (): void => {
        for (let item = session.take(); item !== null; item = session.take()) {
          if (item.kind === "send") transport.write(item.line);
        }
        if (session.manifest !== null) resolve(session.manifest);
        else if (session.phase === "stopped")
          fail(`The board on ${path} did not introduce itself.`);
      };
      const late = performance.now() + INTRODUCTION_ms_MAX;
      timer = setInterval(() => {
        if (session.phase !== "closed") session.elapse(now());
        pump();
        if (performance.now() > late)
          fail(`Nothing that this program understands came from ${path}.`);
      }, LOOK_ms);
      transport.open({
        opened: () => {
          session.connected(now());
          pump();
        },
        line: (line) => {
          session.feed(line, now());
          pump();
        },
        closed: fail,
      });
    });
  } finally {
    clearInterval(timer);
    transport.close();
  }
}

/** What a board's introduction answers of `init`'s questions. */
export function toldBy(manifest: Manifest): Answers {
  const set = channelNamed(manifest, "set");
  const sensor = channelNamed(manifest, "case");
  if (set === undefined || sensor === undefined) {
    throw new Trouble(
      `Board ${manifest.serial} has no channel named ${set === undefined ? "set" : "case"}.`,
      "A bench needs both; mend its firmware. Nothing was written.",
      EXIT.refused,
    );
  }
  return {
    board: manifest.serial,
    rate: `${manifest.rate_perS} /s`,
    ...(sensor.unit === "degC" ? { thermistor: "" } : { full: `${sensor.count_max + 1} counts` }),
    ...(channelNamed(manifest, "photodiode")?.unit === "mW" ? { photodiode: "" } : {}),
  };
}
