import { createInterface } from "node:readline";
import { buildSimulator, type ChipState, readState, spawnRunner } from "./simulator.ts";

/** What the simulated board's pins do at this moment. */
export interface PtyBoardState extends ChipState {
  /** Whether current flows (above 5 mA), as measured at the diode and not as the board reports it. */
  readonly emitting: boolean;
}

/** The board's real firmware behind a pseudo-terminal, at wall-clock speed. */
export interface PtyBoard {
  /** Serial port to open, such as /dev/pts/3. 115200 baud, though a pty does not mind. */
  readonly path: string;
  state(): Promise<PtyBoardState>;
  /** Any command of simavr/commands.h but `run`: `case 45`, `pin key 0`, `reset brown-out`. */
  command(text: string): Promise<string[]>;
  stop(): void;
}

/**
 * Builds what is missing and starts a board whose case warms with its current. It dies with this
 * process. Rejects where the runner cannot be built or says no path within 10 s.
 */
export const startPtyBoard = async (): Promise<PtyBoard> => {
  buildSimulator();
  const child = spawnRunner(["--pty"]);
  const waiting: ((line: string) => void)[] = [];
  let stderr = "";
  child.stderr.on("data", (text: Buffer) => {
    stderr += text.toString();
  });
  createInterface({ input: child.stdout }).on("line", (line) => waiting.shift()?.(line));
  const next = (): Promise<string> =>
    new Promise((resolve, reject) => {
      const giveUp = setTimeout(
        () => reject(new Error(`the simulated board said nothing for 10 s. ${stderr}`)),
        10_000,
      );
      waiting.push((line) => {
        clearTimeout(giveUp);
        resolve(line);
      });
    });

  const [, path] = (await next()).split(" ");
  if (path === undefined) throw new Error(`the simulated board named no port. ${stderr}`);
  const command = async (text: string): Promise<string[]> => {
    const answer = next();
    child.stdin.write(`${text}\n`);
    const words = (await answer).split(" ");
    if (words[0] !== "ok") throw new Error(`${text}: ${words.join(" ")}`);
    return words.slice(1);
  };
  await command("case free");
  return {
    path,
    command,
    state: async () => {
      const state = readState(await command("state"));
      return { ...state, emitting: state.lit };
    },
    stop: () => {
      child.kill("SIGKILL");
    },
  };
};
