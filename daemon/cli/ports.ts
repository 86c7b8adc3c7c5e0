import type { Command } from "commander";
import { listPorts } from "../link/transports/ports.ts";
import { Ports } from "./answers.ts";
import { commandOf } from "./command.ts";
import { print, printJson } from "./say.ts";

/** `ports`: serial ports, and what stands in the way of using each. Opens none of them. */
export const portsCommand = (): Command =>
  commandOf("ports", "list serial ports and what stands in the way of using each; opens none", [
    "ports",
    "ports --json",
  ])
    .option("--json", "one JSON array")
    .action(async (options: { json?: boolean }) => {
      const ports = await listPorts();
      if (options.json === true) printJson(Ports, ports);
      else if (ports.length === 0) {
        print("No serial port is to be seen. Plug the board in; a path can be given all the same.");
      } else {
        for (const port of ports) {
          const what = port.description === "" ? "" : `, ${port.description}`;
          print(`${port.path}${what}: ${port.problem === "" ? "usable" : port.problem}`);
        }
      }
    });
