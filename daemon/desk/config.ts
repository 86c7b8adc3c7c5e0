import { z } from "zod";
import type { InfluxPart } from "../model/bench.ts";
import type { Conversion } from "../model/conversion.ts";

/** What the daemon hands the desk when starting it, as JSON in the first argument. */
export const DeskConfig = z.object({
  /** Local socket of the switch. */
  switchPath: z.string().min(1),
  /** Data folder with the record. */
  folder: z.string().min(1),
  /** Address to listen on; anything but a loopback address must have been asked for. */
  host: z.string().min(1).default("127.0.0.1"),
  /** 0 takes any free port; the one taken is told in `listening`. */
  port: z.number().int().min(0).max(65_535),
  /** Port of the judging thread that takes `POST /dark` and nothing else; 0 where there is none. */
  darkPort: z.number().int().min(0).max(65_535),
  /** File of mode 0600 with the token for scripts and for other machines; made where missing. */
  tokenFile: z.string().min(1),
  /** Names other than addresses under which other machines reach this one. */
  names: z.array(z.string()).default([]),
  /** How the bench's channels become units, by channel; the board's own scale where left out. */
  conversions: z.record(z.string(), z.custom<Conversion>()).optional(),
  /** Server from which older samples and events are read instead of from the folder. */
  influx: z.custom<InfluxPart>().optional(),
  /** Folder of the built pages; the package's own where left out. */
  pages: z.string().optional(),
});
export type DeskConfig = z.infer<typeof DeskConfig>;

/** From the daemon to the desk, over the channel between parent and child. */
export const ToDesk = z.discriminatedUnion("kind", [
  z.object({ kind: z.literal("code"), code: z.string().min(16).max(200) }),
  /** A bench file was adopted: its conversions from now on. */
  z.object({
    kind: z.literal("conversions"),
    conversions: z.record(z.string(), z.custom<Conversion>()),
  }),
]);
export type ToDesk = z.infer<typeof ToDesk>;

/** From the desk to the daemon. */
export type FromDesk =
  | { readonly kind: "listening"; readonly host: string; readonly port: number }
  /** Once a second; a late one means that the desk hangs and is to be restarted. */
  | { readonly kind: "beat"; readonly clients: number }
  | { readonly kind: "failed"; readonly words: string };

export const BEAT_ms = 1000;
