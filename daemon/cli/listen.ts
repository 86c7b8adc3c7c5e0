import type { Command } from "commander";
import { checkLine } from "../../firmware-protocol/line.ts";
import { SerialTransport } from "../link/transports/serial.ts";
import { Heard } from "./answers.ts";
import { commandOf } from "./command.ts";
import { EXIT, jsonLine, print, Trouble } from "./say.ts";
import { durationOf, wholeOf } from "./values.ts";

interface Options {
  readonly baud: string;
  readonly for?: string;
  readonly json?: boolean;
}

/** A day; whoever wants longer leaves `--for` out. */
const LISTEN_ms_MAX = 24 * 3_600_000;

/** `listen PORT`: raw lines as they come, each with what is broken about it. Sends nothing. */
export const listenCommand = (): Command =>
  commandOf(
    "listen",
    "show the raw lines of a serial port; sends nothing",
    ["listen /dev/ttyACM0", "listen /dev/ttyUSB0 --baud 500000 --for 10s --json"],
    "Opening a port resets many boards; a board that is armed goes dark by that, and latches.",
  )
    .argument("<port>", "device, as `beamsitter ports` names it")
    .option("--baud <number>", "speed of the line", "115200")
    .option("--for <time>", "end by itself after this long")
    .option("--json", "one JSON object a line: {line, broken}")
    .action((path: string, options: Options) => listen(path, options));

async function listen(path: string, options: Options): Promise<void> {
  const baud = wholeOf("--baud", options.baud, 50, 4_000_000);
  const for_ms = options.for === undefined ? null : durationOf(options.for, LISTEN_ms_MAX);
  const transport = new SerialTransport({ path, baud });
  let lines = 0;
  const why = await new Promise<string>((resolve) => {
    process.once("SIGINT", () => resolve(""));
    if (for_ms !== null) setTimeout(() => resolve(""), for_ms);
    transport.open({
      opened: () =>
        options.json === true || print(`Listening on ${transport.name}. Ctrl-C ends it.`),
      line: (line) => {
        lines++;
        const broken = checkLine(line, "host");
        if (options.json === true) print(jsonLine(Heard, { line, broken }));
        else print(broken === null ? line : `${line}   (${broken})`);
      },
      closed: resolve,
    });
  });
  transport.close();
  if (why !== "") throw new Trouble(why, "beamsitter ports lists what is there.");
  if (lines === 0) {
    throw new Trouble(
      `Nothing came from ${path} at ${baud} baud.`,
      "Try another --baud; look whether the board is powered.",
      EXIT.refused,
    );
  }
}
