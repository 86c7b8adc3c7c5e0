import type { Command } from "commander";
import { SwitchClient } from "../control/client.ts";
import { Darkened } from "./answers.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";
import { EXIT, print, printJson, reasonOf } from "./say.ts";
import { lives, type Notice, notices } from "./where.ts";

/** How long switch and dark port may take before the daemon itself is ended, ms. */
const WAY_ms_MAX = 700;

/**
 * `dark`: three ways, each simpler than the one before; the first two at once. Without `--on` every
 * running bench goes dark: at that moment nobody wants to be asked which.
 */
export const darkCommand = (): Command =>
  daemonCommandOf(
    "dark",
    "cut the light now; without --on, of every running bench",
    ["dark", "dark --on north --json"],
    "Where the daemon answers on neither of its two ways, it is ended: without its permits the board\ngoes dark by itself.",
  ).action(dark);

async function dark(options: DaemonOptions): Promise<void> {
  const running = notices().filter(lives);
  const meant = running.filter((n) => options.on === undefined || n.bench === options.on);
  const benches = await Promise.all(meant.map(darken));
  if (options.json === true) printJson(Darkened, { benches });
  else if (benches.length === 0) for (const line of nobodyWords(options.on, running)) print(line);
  else for (const { words } of benches) print(words);
  process.exitCode =
    benches.length === 0 ? EXIT.absent : benches.every((t) => t.ok) ? EXIT.done : EXIT.refused;
}

function nobodyWords(on: string | undefined, running: readonly Notice[]): string[] {
  const lines =
    on === undefined
      ? ["No daemon runs here, so none sends permits; a board without them is dark by itself."]
      : [`No daemon runs here for a bench named "${on}"; nothing was done.`];
  if (running.length > 0) lines.push(`Running now: ${running.map((n) => n.bench).join(", ")}.`);
  lines.push("Whether some other computer drives the bench is not known here: go and look.");
  return lines;
}

async function darken(notice: Notice): Promise<Darkened> {
  const { bench } = notice;
  // Both at once: a dark too many does no harm, and nobody waits for the way that is stuck.
  const ways = [
    askSwitch(notice).then((told) => ({ bench, way: "switch" as const, ...told })),
    askPort(notice).then((told) => ({ bench, way: "dark port" as const, ...told })),
  ];
  return (await within(Promise.any(ways))) ?? endDaemon(notice);
}

/** What a way said. A bench that is only watched refuses, and says that nothing here cuts it. */
interface Said {
  readonly ok: boolean;
  readonly words: string;
}

async function askSwitch(notice: Notice): Promise<Said> {
  const client = await SwitchClient.connect(notice.socket);
  const answer = await client.ask({ verb: "dark", asker: "person" });
  client.close();
  return { ok: answer.ok, words: answer.words };
}

async function askPort(notice: Notice): Promise<Said> {
  const response = await fetch(`http://127.0.0.1:${notice.darkPort}/dark`, { method: "POST" });
  const body = (await response.json()) as { ok?: unknown; words?: unknown };
  const words = typeof body.words === "string" ? body.words : "Dark was heard.";
  return { ok: body.ok !== false, words };
}

/** What the quicker way said, or null where neither answered in time: then the daemon is ended. */
async function within(way: Promise<Darkened>): Promise<Darkened | null> {
  let timer: NodeJS.Timeout | undefined;
  const late = new Promise<null>((resolve) => {
    timer = setTimeout(() => resolve(null), WAY_ms_MAX);
  });
  const told = await Promise.race([way.catch(() => null), late]);
  clearTimeout(timer);
  return told;
}

function endDaemon(notice: Notice): Darkened {
  const base = { bench: notice.bench, way: "daemon ended" as const };
  if (!notice.endsLight) {
    const words =
      "the daemon answers on neither way, and ending it would not end this light, which needs no permits. Turn the key or cut the supply.";
    return { ...base, ok: false, words };
  }
  try {
    process.kill(notice.pid, "SIGKILL");
    return {
      ...base,
      ok: true,
      words: `The daemon of ${notice.bench} answered on neither way, so it was ended (process ${notice.pid}). Without permits the board is dark within the term and the fall of its stage. Go and look.`,
    };
  } catch (error) {
    return {
      ...base,
      ok: false,
      words: `The daemon of ${notice.bench} answers on neither way and could not be ended: ${reasonOf(error)}. Turn the key or open the interlock.`,
    };
  }
}
