import { type Guess, guessStream, type HeardLine } from "../link/plain/guess.ts";
import { SerialTransport } from "../link/transports/serial.ts";
import { STREAM_LINE_BYTES_MAX } from "../model/stream.ts";

/** Line rates that boards use, the likeliest first. */
const RATES_baud = [
  115_200, 9600, 57_600, 38_400, 19_200, 230_400, 250_000, 500_000, 1_000_000, 2_000_000, 4800,
  2400, 1200,
];
/** A board that was reset by the opening takes up to two seconds to its first line. */
const FIRST_ms = 3500;
/** Longest stay at a rate where whole lines come: twelve of a stream of one a second. */
const STAY_ms = 12_000;
const LINES_ENOUGH = 60;
/** Shortest stay, so that the rate of lines can be told. */
const STAY_ms_MIN = 2000;
/** A guess that explains this much of the lines ends the search. */
const SHARE_GOOD = 0.6;
const LOOK_ms = 50;

/** What was heard at the line rate that fits best. */
export interface Heard {
  readonly baud: number;
  readonly guess: Guess;
  readonly lines: readonly HeardLine[];
}

export interface GuessOptions {
  readonly path: string;
  /** The only rate to be tried, or null for the usual ones. */
  readonly baud: number | null;
  /** Longest stay at a rate, ms; null for the usual one. */
  readonly for_ms: number | null;
  /** Whether the port's lines stay asserted at the end: one of them holds light off. */
  readonly keepsLines: boolean;
  /** A word on what is tried. */
  tell(words: string): void;
}

/**
 * Listens at one line rate after the other until the lines make sense. Rejects with the port's own
 * words where it cannot be opened.
 */
export async function guessPort(options: GuessOptions): Promise<Heard> {
  let best: Heard | null = null;
  for (const baud of options.baud === null ? RATES_baud : [options.baud]) {
    options.tell(`Listening at ${baud} baud.`);
    const lines = await hear(options, baud);
    const heard = { baud, guess: guessStream(lines), lines };
    if (best === null || better(heard, best)) best = heard;
    if (heard.guess.format !== null && heard.guess.share >= SHARE_GOOD) break;
  }
  // The list of rates is never empty.
  return best as Heard;
}

const better = (a: Heard, b: Heard): boolean =>
  a.guess.share > b.guess.share || (b.lines.length === 0 && a.lines.length > 0);

/** The lines that come at one rate. Resolves early where none make sense. */
function hear(options: GuessOptions, baud: number): Promise<HeardLine[]> {
  const { path, keepsLines } = options;
  const stay_ms = options.for_ms ?? STAY_ms;
  const transport = new SerialTransport({
    path,
    baud,
    keepsLines,
    silence_ms: stay_ms + FIRST_ms,
    lineBytes_max: STREAM_LINE_BYTES_MAX,
  });
  const lines: HeardLine[] = [];
  return new Promise((resolve, reject) => {
    const began = performance.now();
    const end = (): void => {
      clearInterval(timer);
      transport.close();
      resolve(lines);
    };
    const timer = setInterval(() => {
      if (isEnough(lines, performance.now() - began, stay_ms)) end();
    }, LOOK_ms);
    transport.open({
      opened: () => {},
      line: (line) => lines.push({ line, at_ms: performance.now() }),
      closed: (why) => {
        clearInterval(timer);
        reject(new Error(why));
      },
    });
  });
}

/** Whether more listening at this rate would tell nothing more. */
function isEnough(lines: readonly HeardLine[], past_ms: number, stay_ms: number): boolean {
  if (past_ms >= stay_ms) return true;
  if (past_ms >= STAY_ms_MIN && lines.length >= LINES_ENOUGH) return true;
  if (past_ms < FIRST_ms) return false;
  return lines.length === 0 || (lines.length > 3 && guessStream(lines).format === null);
}
