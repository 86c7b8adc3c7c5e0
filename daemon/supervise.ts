import type { EventLine, Snapshot, SwitchAnswer, SwitchRequest } from "./control/api.ts";
import { type DarkPort, serveDarkPort } from "./control/dark-port.ts";
import { type Switch, serveSwitch } from "./control/switch.ts";
import { Reconnect } from "./link/transports/reconnect.ts";
import type { Transport } from "./link/transports/transport.ts";
import { Asking } from "./loop/asking.ts";
import { Loop, type Received } from "./loop/loop.ts";
import { meaningOf } from "./loop/meaning.ts";
import type { Curve, LoopAnswer } from "./loop/ports.ts";
import { snapshotOf } from "./loop/snapshot.ts";
import type { Bench } from "./model/bench.ts";
import type { Manifest } from "./model/manifest.ts";
import type { StoredLatch, ToRecorder } from "./model/record-messages.ts";
import type { Ring } from "./model/ring.ts";
import { type Mono_ms, mono, wall } from "./model/times.ts";

/**
 * The judging thread: link, judge, switch, and listening for dark. Nothing here touches a disk or
 * waits for anybody. A line comes in at `#line`, is judged by the loop, and what the loop orders is
 * written before anything else is done.
 */
export interface SuperviseOptions {
  readonly bench: Bench;
  readonly transport: () => Transport;
  readonly ring: Ring;
  readonly latch: StoredLatch | null;
  readonly lastEventId: number;
  readonly socketPath: string;
  readonly darkHosts: readonly string[];
  record(message: ToRecorder): void;
  recorder(): { readonly behind_ms: number; readonly words: string };
  curve(bench: Bench, manifest: Manifest): Curve | { readonly problems: readonly string[] };
  /** Reads a changed bench file: what would differ, and with `use` set, the bench to use. */
  read(text: string): { readonly bench: Bench | null; readonly lines: readonly string[] };
  differences(from: Bench, to: Bench): readonly string[];
  /** A fresh address that signs a page in, or null where no desk is up. */
  sign(): string | null;
  /** A changed bench file is in use. */
  adopted(bench: Bench): void;
  /** Something happened, in words; must not wait for whoever reads them. */
  event(line: EventLine): void;
  /** A program asked the daemon to end. */
  stop(): void;
}

/** How often watchers get a snapshot, and how often deadlines are looked at, ms. */
const SNAPSHOT_ms = 100;
const DEADLINE_ms = 5;

export class Supervision {
  readonly loop: Loop;
  readonly #options: SuperviseOptions;
  readonly #asking: Asking;
  #link: Reconnect | null = null;
  #pending: Received[] = [];
  #scheduled = false;
  #switch: Switch | null = null;
  readonly #darkPorts: DarkPort[] = [];
  readonly #toldOfPort = new Set<string>();
  readonly #timers: NodeJS.Timeout[] = [];

  private constructor(options: SuperviseOptions) {
    this.#options = options;
    this.loop = new Loop(
      options.bench,
      {
        now,
        wall: () => wall(Date.now()),
        write: (line) => this.#link?.write(line) ?? false,
        drained: () => this.#link?.drained ?? false,
        level: (order) => this.#link?.level(order),
        record: (message) => options.record(message),
        event: (event) => {
          this.#switch?.push({ push: "event", event });
          options.event(event);
        },
        curve: (bench, manifest) => options.curve(bench, manifest),
      },
      options.ring,
      options.latch,
    );
    this.loop.telling.startAfter(options.lastEventId);
    this.#asking = new Asking(this.loop);
    this.loop.onStep = () => this.#asking.settle(now());
  }

  /** Opens switch, dark ports and link. Rejects where the switch or a dark port cannot listen. */
  static async start(options: SuperviseOptions): Promise<Supervision> {
    const s = new Supervision(options);
    s.#switch = await serveSwitch(options.socketPath, {
      ask: (request, answer) => s.#ask(request, answer),
    });
    for (const host of options.darkHosts) {
      const port = s.#darkPorts[0]?.port ?? 0;
      s.#darkPorts.push(await serveDarkPort(host, port, () => s.dark()));
    }
    s.#timers.push(setInterval(() => s.#elapse(), DEADLINE_ms));
    s.#timers.push(setInterval(() => s.#show(), SNAPSHOT_ms));
    s.#link = new Reconnect(options.transport, {
      opened: () => s.loop.opened(now()),
      line: (line) => s.#line(line),
      closed: (why) => s.loop.closed(now(), why),
    });
    return s;
  }

  get darkPort(): number {
    return this.#darkPorts[0]?.port ?? 0;
  }

  /** Cuts the light. Used by the dark port; the switch's dark takes the same way. */
  dark(): { ok: boolean; words: string } {
    let told: LoopAnswer = { ok: false, reason: "", words: "" };
    this.#asking.ask({ id: 0, verb: "dark", asker: "page" }, now(), (a) => {
      told = a;
    });
    return { ok: told.ok, words: told.words };
  }

  /** Leaves the bench dark with that cause (0: a person ended the daemon) before an end. */
  leave(cause: number): void {
    this.loop.request("stop", cause, "person", 0, now());
  }

  /** Sends a dark past everything: the last act after a defect. */
  emergency(cause: number): void {
    this.loop.emergency(cause);
  }

  snapshot(): Snapshot {
    return snapshotOf(this.loop, {
      wall_ms: Date.now(),
      now_ms: now(),
      port: this.#link?.trouble() ?? "",
      recorder: this.#options.recorder(),
    });
  }

  close(): void {
    for (const timer of this.#timers) clearInterval(timer);
    this.#link?.close();
    for (const port of this.#darkPorts) port.close();
    this.#switch?.close();
  }

  /** A line was read. All lines read in one go are judged together, right after the reading. */
  #line(line: string): void {
    this.#pending.push({ line, at: now() });
    if (this.#scheduled) return;
    this.#scheduled = true;
    setImmediate(() => this.#receive());
  }

  #receive(): void {
    this.#scheduled = false;
    const lines = this.#pending;
    this.#pending = [];
    this.loop.receive(lines);
  }

  #elapse(): void {
    const at = now();
    if (at >= this.loop.nextDeadline()) this.loop.elapse(at);
    this.#asking.settle(at);
  }

  #show(): void {
    this.#tellPort();
    const toWatchers = this.#switch;
    if (toWatchers !== null && toWatchers.watchers > 0) {
      toWatchers.push({ push: "snapshot", snapshot: this.snapshot() });
    }
  }

  /** A port that does not come, or goes, is told once for each reason, until lines come again. */
  #tellPort(): void {
    const { why, tries, state } = this.#link?.status ?? { why: "", tries: 0, state: "open" };
    if (state === "open" && tries === 0) this.#toldOfPort.clear();
    else if (why !== "") {
      // Seconds and counts within a reason differ from try to try.
      const reason = why.replace(/[\d.]+/g, "");
      if (this.#toldOfPort.has(reason)) return;
      this.#toldOfPort.add(reason);
      this.loop.telling.say("link", "port", why, "warn", null, 0, 0);
    }
  }

  #ask(request: SwitchRequest, answer: (a: SwitchAnswer) => void): void {
    const say = (a: LoopAnswer): void => answer({ id: request.id, ...a });
    switch (request.verb) {
      case "dark":
      case "arm":
      case "set":
      case "reset":
        this.#asking.ask(request, now(), say);
        break;
      case "status":
      case "watch":
        say({ ok: true, reason: "", words: "", snapshot: this.snapshot() });
        break;
      case "mean":
        say(meaningOf(this.loop, request.current_mA, this.#link?.trouble() ?? ""));
        break;
      case "rawlog":
        say({ ok: true, reason: "", words: "", lines: this.loop.session.log.words() });
        break;
      case "adopt":
        say(this.#adopt(request.benchText, request.confirm));
        break;
      case "sign":
        say(this.#sign());
        break;
      case "stop":
        say({ ok: true, reason: "", words: "The daemon ends; the bench is left dark." });
        this.#options.stop();
        break;
      default:
        request satisfies never;
    }
  }

  #sign(): LoopAnswer {
    const address = this.#options.sign();
    if (address === null) {
      return { ok: false, reason: "no-answer", words: "The desk is not up yet; the judge is." };
    }
    return { ok: true, reason: "", words: "", address };
  }

  #adopt(text: string, confirm: boolean): LoopAnswer {
    const own = this.loop.bench;
    const { state } = this.snapshot();
    // Asked before the file is read: reading takes longer than the permits of a lit bench may wait.
    if (!this.loop.mayAdopt) {
      const is = state === "standby" ? "being armed" : state;
      const words = `${own.name} is ${is}; a bench file is adopted only while dark.`;
      return { ok: false, reason: "not-standby", words };
    }
    const { bench, lines } = this.#options.read(text);
    if (bench === null) return form("This file cannot be used:", lines);
    if (bench.name !== own.name) {
      return form(`This file describes "${bench.name}"; this daemon runs "${own.name}".`);
    }
    const differences = [...this.#options.differences(own, bench)];
    if (differences.length === 0) {
      return { ok: true, reason: "", words: "Nothing differs from the file in use.", lines: [] };
    }
    const misfit = this.#misfit(bench, differences);
    if (misfit !== null) return misfit;
    if (!confirm) return { ok: true, reason: "", words: "What would change:", lines: differences };
    this.loop.adopt(bench, text, now());
    this.#options.adopted(bench);
    this.loop.telling.say("adopted", "", `Adopted: ${differences.join(" ")}`, "calm", null, 0, 0);
    return { ok: true, reason: "", words: `${own.name} uses this file now.`, lines: differences };
  }

  /** Why a changed file, sound in itself, cannot be taken into use by this daemon on this board. */
  #misfit(bench: Bench, differences: readonly string[]): LoopAnswer | null {
    const atStart = differences.filter((line) => AT_START.test(line));
    if (atStart.length > 0) {
      return form("These change only when the daemon starts; end it and run it again:", atStart);
    }
    const { manifest } = this.loop.session;
    const curve = manifest === null ? null : this.#options.curve(bench, manifest);
    if (curve === null || !("problems" in curve)) return null;
    return form("This file does not fit the board that is connected:", curve.problems);
  }
}

/** Places in a bench file that decide how the daemon connects. */
const AT_START = /^controller\.(connect|board|rate|stream|cut-off)\b/;

const form = (words: string, lines: readonly string[] = []): LoopAnswer => ({
  ok: false,
  reason: "form",
  words,
  lines: [...lines],
});

const now = (): Mono_ms => mono(performance.now());
