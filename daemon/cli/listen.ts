import { Command } from "commander";
import { checkLine } from "../../firmware-protocol/line.ts";
import { SerialTransport } from "../link/transports/serial.ts";
import { durationOf } from "./currents.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";

interface Options {
  readonly baud: string;
  readonly for?: string;
  readonly json?: boolean;
}

/** `listen PORT`: raw lines as they come, each with what is broken about it. Sends nothing. */
export const listenCommand = (): Command =>
  new Command("listen")
    .description("show the raw lines of a serial port; sends nothing")
    .argument("<port>", "device, as `beamsitter ports` names it")
    .option("--baud <number>", "speed of the line", "115200")
    .option("--for <time>", "end by itself after this long")
    .option("--json", "one JSON object a line: {line, broken}")
    .addHelpText(
      "after",
      `
Opening a port resets many boards; a board that is armed goes dark by that, and latches.

Example:
  beamsitter listen /dev/ttyACM0`,
    )
    .action((path: string, options: Options) => listen(path, options));

async function listen(path: string, options: Options): Promise<void> {
  const baud = Number(options.baud);
  if (!Number.isInteger(baud) || baud <= 0) {
    throw new Trouble(`--baud ${options.baud} is no speed.`, "Write --baud 115200.", EXIT.usage);
  }
  const transport = new SerialTransport({ path, baud });
  let lines = 0;
  const why = await new Promise<string>((resolve) => {
    process.once("SIGINT", () => resolve(""));
    if (options.for !== undefined) setTimeout(() => resolve(""), durationOf(options.for));
    transport.open({
      opened: () =>
        options.json === true || print(`Listening on ${transport.name}. Ctrl-C ends it.`),
      line: (line) => {
        lines++;
        const broken = checkLine(line, "host");
        if (options.json === true) printJson({ line, broken });
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
