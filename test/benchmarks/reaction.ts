import { type ChildProcess, spawn, spawnSync } from "node:child_process";
import { mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { createInterface } from "node:readline";
import { fileURLToPath } from "node:url";
import { SwitchClient } from "../../daemon/control/client.ts";
import { assetFile, builtFile, packageRoot } from "../../daemon/paths.ts";
import type { Figure } from "./figure.ts";

/** Seconds of each measurement; the peer's follows in the same minute. */
const SECONDS = 20;
const REACTION = join(packageRoot, "test/benchmarks/reaction");
const BOARD = "firmware-protocol/c";

interface Timed {
  readonly samples: number;
  readonly n: number;
  readonly p50: number;
  readonly p99: number;
  readonly p999: number;
  readonly worst: number;
  /** Cause of a trip during the measurement; −1 where there was none. */
  readonly dark: number;
}

/**
 * Line received → permit written, over a pseudo terminal, with the record on and five pages
 * watching; against a C program that echoes the same lines.
 */
export async function reaction(): Promise<Figure[]> {
  const folder = mkdtempSync(join(tmpdir(), "bs-reaction-"));
  try {
    compile(folder);
    const figures: Figure[] = [];
    for (const rate_perS of [100, 1000]) {
      const { ours, rss_MB } = await measureDaemon(folder, rate_perS);
      const echo = await measureEcho(folder, rate_perS);
      figures.push(...figuresOf(rate_perS, ours, echo));
      if (rate_perS === 1000) figures.push({ name: "daemon.rssMb", value: rss_MB, unit: "MB" });
    }
    return figures;
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

/** p99.9 at 1000 samples a second while `beside` works on the daemon's own record, and the echo's. */
export async function reactionBeside(
  beside: (record: string) => () => void,
): Promise<{ ours_ms: number; echo_ms: number }> {
  const folder = mkdtempSync(join(tmpdir(), "bs-reaction-"));
  try {
    compile(folder);
    const { ours } = await measureDaemon(folder, 1000, beside);
    const echo = await measureEcho(folder, 1000);
    return { ours_ms: ours.p999, echo_ms: echo.p999 };
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

function figuresOf(rate_perS: number, ours: Timed, echo: Timed): Figure[] {
  const name = `reaction.${rate_perS}`;
  const against = (value: number, peer: number) => ({
    value,
    unit: "ms",
    peer: "c-echo",
    ratio: peer / value,
  });
  return [
    { name: `${name}.p50`, ...against(ours.p50, echo.p50) },
    { name: `${name}.p99`, ...against(ours.p99, echo.p99) },
    { name: `${name}.p999`, ...against(ours.p999, echo.p999) },
    { name: `${name}.worst`, ...against(ours.worst, echo.worst) },
    { name: `${name}.permits`, value: ours.n, unit: "1" },
    { name: `${name}.dark`, value: ours.dark, unit: "cause" },
  ];
}

function compile(folder: string): void {
  const core = join(packageRoot, BOARD);
  const sources = readdirSync(core).filter((f) => f.endsWith(".c"));
  cc(
    [join(REACTION, "board.c"), ...sources.map((f) => join(core, f))],
    join(folder, "board"),
    core,
  );
  cc([join(REACTION, "echo.c")], join(folder, "echo"), core);
}

function cc(sources: string[], out: string, include: string): void {
  const result = spawnSync("cc", ["-O2", "-I", include, "-o", out, ...sources], {
    encoding: "utf8",
  });
  if (result.status !== 0) throw new Error(`cc failed: ${result.stderr}`);
}

async function measureDaemon(
  folder: string,
  rate_perS: number,
  beside?: (record: string) => () => void,
): Promise<{ ours: Timed; rss_MB: number }> {
  const board = spawn(join(folder, "board"), [`${rate_perS}`, `${SECONDS}`, "permits"]);
  const lines = linesOf(board);
  const path = await lines.next();
  const run = join(folder, `run-${rate_perS}`);
  mkdirSync(run, { mode: 0o700 });
  const file = join(run, "bench.yaml");
  writeFileSync(file, benchText(path, rate_perS));
  const stop = beside?.(join(run, "data", "beamsitter", "bare-diode"));
  const env = { ...process.env, XDG_RUNTIME_DIR: run, XDG_DATA_HOME: join(run, "data") };
  const cli = fileURLToPath(builtFile("daemon/cli/main.js"));
  const daemon = spawn(process.execPath, [cli, "run", "--bench", file, "--port", "0"], {
    env,
    stdio: ["ignore", "pipe", "inherit"],
  });
  try {
    const address = /its page: (\S+)/.exec(await linesOf(daemon).next())?.[1] ?? "";
    const watchers = spawn(
      process.execPath,
      [fileURLToPath(builtFile("test/benchmarks/watchers.js")), address],
      { stdio: ["ignore", "pipe", "inherit"] },
    );
    await linesOf(watchers).next();
    await arm(join(run, "beamsitter", "bare-diode.socket"));
    const ours = JSON.parse(await lines.next()) as Timed;
    const rss_MB = residentMB(daemon.pid ?? 0);
    watchers.kill("SIGKILL");
    return { ours, rss_MB };
  } finally {
    stop?.();
    daemon.kill("SIGKILL");
    board.kill("SIGKILL");
  }
}

async function measureEcho(folder: string, rate_perS: number): Promise<Timed> {
  const board = spawn(join(folder, "board"), [`${rate_perS}`, `${SECONDS}`, "echo"]);
  const lines = linesOf(board);
  const echo = spawn(join(folder, "echo"), [await lines.next()]);
  const timed = JSON.parse(await lines.next()) as Timed;
  echo.kill("SIGKILL");
  return timed;
}

/** Arms as soon as the board may be armed. */
async function arm(socket: string): Promise<void> {
  const client = await SwitchClient.connect(socket);
  await new Promise<void>((resolve, reject) => {
    let asked = false;
    client
      .watch((push) => {
        if (push.push !== "snapshot" || asked) return;
        const s = push.snapshot;
        if (s.state !== "standby" || s.link.phase !== "ready") return;
        asked = true;
        client.ask({ verb: "arm", current_mA: 1000, asker: "script" }).then((a) => {
          if (a.ok) resolve();
          else asked = false;
        }, reject);
      })
      .catch(reject);
  });
  client.close();
}

/** The bare diode's file at this terminal, this rate, and a speed that the wire budget allows. */
const benchText = (path: string, rate_perS: number): string =>
  readFileSync(assetFile("daemon/bench-file/benches/bare-diode.yaml"), "utf8")
    .replace(/path: \S+/, `path: ${path}`)
    .replace("baud: 115200 baud", "baud: 4000000 baud")
    .replace("rate: 50 /s", `rate: ${rate_perS} /s`);

function residentMB(pid: number): number {
  const status = readFileSync(`/proc/${pid}/status`, "utf8");
  return Number(/VmRSS:\s+(\d+) kB/.exec(status)?.[1] ?? Number.NaN) / 1000;
}

interface Lines {
  next(): Promise<string>;
}

function linesOf(child: ChildProcess): Lines {
  if (child.stdout === null) throw new Error("the program has no output");
  const got: string[] = [];
  const waiting: ((line: string) => void)[] = [];
  createInterface({ input: child.stdout }).on("line", (line) => {
    const first = waiting.shift();
    if (first === undefined) got.push(line);
    else first(line);
  });
  return {
    next: () =>
      new Promise((resolve, reject) => {
        const line = got.shift();
        if (line !== undefined) resolve(line);
        else {
          waiting.push(resolve);
          child.once("exit", (code) => reject(new Error(`${child.spawnfile} ended with ${code}`)));
        }
      }),
  };
}
