import type { Command } from "commander";
import { describePorts, type PortFacts } from "../link/transports/port-facts.ts";
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
      const ports = await describePorts();
      if (options.json === true) {
        printJson(
          Ports,
          ports.map((port) => ({ ...port, advice: [...port.advice] })),
        );
      } else if (ports.length === 0) {
        print("No serial port is to be seen. Plug the board in; a path can be given all the same.");
      } else for (const port of ports) for (const line of linesOf(port)) print(line);
    });

/** A port and below it everything worth knowing, each with what to do. */
export function linesOf({ path, description, driver, problem, advice }: PortFacts): string[] {
  const what = [description, driver].filter((word) => word !== "").join(", ");
  const head = `${path}${what === "" ? "" : `, ${what}`}: ${problem === "" ? "usable" : problem}`;
  return [head, ...advice.flatMap((one) => [`  ${one.found}`, `      ${one.do}`])];
}
