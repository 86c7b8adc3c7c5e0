import type { Command } from "commander";
import { checkLine } from "../../firmware-protocol/line.ts";
import { pieceOf } from "../link/plain/piece.ts";
import { SerialTransport } from "../link/transports/serial.ts";
import { STREAM_LINE_BYTES_MAX } from "../model/stream.ts";
import { Guessed, Heard } from "./answers.ts";
import { commandOf } from "./command.ts";
import { guessPort } from "./guessing.ts";
import { type PortCaution, portCaution } from "./port-caution.ts";
import { EXIT, jsonLine, print, printJson, progress, reasonOf, Trouble } from "./say.ts";
import { durationOf, wholeOf } from "./values.ts";

interface Options {
  readonly baud?: string;
  readonly for?: string;
  readonly guess?: boolean;
  readonly bench?: string;
  readonly json?: boolean;
}

/** A day; whoever wants longer leaves `--for` out. */
const LISTEN_ms_MAX = 24 * 3_600_000;
const BAUD = 115_200;

/** `listen PORT`: raw lines as they come, or with `--guess` what they probably mean. Sends nothing. */
export const listenCommand = (): Command =>
  commandOf(
    "listen",
    "show the raw lines of a serial port, or guess what they mean; sends nothing",
    [
      "listen /dev/ttyACM0",
      "listen /dev/ttyUSB0 --baud 500000 --for 10s --json",
      "listen /dev/ttyUSB0 --guess --bench bench.yaml",
    ],
    "Opening a port resets many boards; a board that is armed goes dark by that, and latches.\nWith --guess the usual speeds are tried, unless --baud names one, and a piece of bench file is\nproposed; what cannot be told is named.",
  )
    .argument("<port>", "device, as `beamsitter ports` names it")
    .option("--baud <number>", "speed of the line; 115200 without --guess")
    .option("--for <time>", "end by itself after this long")
    .option("--guess", "find out speed, format and columns, and propose them for a bench file")
    .option(
      "--bench <file>",
      "the port's bench file: tells first where opening the port cuts light",
    )
    .option("--json", "one JSON object a line: {line, broken}; with --guess one object")
    .action((path: string, options: Options) => listen(path, options));

async function listen(path: string, options: Options): Promise<void> {
  const baud = options.baud === undefined ? null : wholeOf("--baud", options.baud, 50, 4_000_000);
  const for_ms = options.for === undefined ? null : durationOf(options.for, LISTEN_ms_MAX);
  const caution = portCaution(path, options.bench);
  if (caution.words !== "") process.stderr.write(`${caution.words}\n`);
  if (options.guess === true) await guess(path, baud, for_ms, caution, options.json === true);
  else await show(path, baud ?? BAUD, for_ms, caution, options.json === true);
}

async function show(
  path: string,
  baud: number,
  for_ms: number | null,
  { keepsLines }: PortCaution,
  json: boolean,
): Promise<void> {
  const lineBytes_max = STREAM_LINE_BYTES_MAX;
  const transport = new SerialTransport({ path, baud, keepsLines, lineBytes_max });
  let lines = 0;
  const why = await new Promise<string>((resolve) => {
    process.once("SIGINT", () => resolve(""));
    if (for_ms !== null) setTimeout(() => resolve(""), for_ms);
    transport.open({
      opened: () => json || print(`Listening on ${transport.name}. Ctrl-C ends it.`),
      line: (line) => {
        lines++;
        const broken = checkLine(line, "host");
        if (json) print(jsonLine(Heard, { line, broken }));
        else print(broken === null || !line.startsWith("<") ? line : `${line}   (${broken})`);
      },
      closed: resolve,
    });
  });
  transport.close();
  if (why !== "") throw new Trouble(why, "beamsitter ports lists what is there.");
  if (lines === 0) throw nothingCame(path, ` at ${baud} baud`);
}

const nothingCame = (path: string, at: string): Trouble =>
  new Trouble(
    `Nothing came from ${path}${at}.`,
    "Try another --baud; look whether the board is powered.",
    EXIT.refused,
  );

async function guess(
  path: string,
  only: number | null,
  for_ms: number | null,
  { keepsLines }: PortCaution,
  json: boolean,
): Promise<void> {
  const heard = await guessPort({ path, baud: only, for_ms, keepsLines, tell: progress }).catch(
    (error) => {
      throw new Trouble(reasonOf(error), "beamsitter ports lists what is there.");
    },
  );
  progress("");
  const { baud, guess: found, lines } = heard;
  if (lines.length === 0) throw nothingCame(path, only === null ? " at any usual speed" : "");
  const { format, undecided } = found;
  const piece = format === null ? "" : pieceOf(found, { kind: "serial", path, baud });
  if (json) {
    const columns = found.columns.map(({ name, channel, unit, confidence }) => {
      return { name, channel, unit, confidence };
    });
    printJson(Guessed, { baud, format, columns, undecided: [...undecided], piece });
  } else {
    if (piece !== "") print(`# ${path} at ${baud} baud: ${format}. For a bench file:\n${piece}`);
    for (const doubt of undecided) print(`Undecided: ${doubt}`);
  }
  if (format === null) process.exitCode = EXIT.refused;
}
