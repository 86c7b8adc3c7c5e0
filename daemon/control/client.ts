import { connect, type Socket } from "node:net";
import { SwitchAnswer, SwitchPush, type SwitchRequest } from "./api.ts";
import { LineCutter } from "./lines.ts";

type WithoutId<T> = T extends unknown ? Omit<T, "id"> : never;
/** A request as callers write it: the number is the client's business. */
export type Question = WithoutId<SwitchRequest>;

/** How long an answer may take, ms. Arming is the slowest: offer, answer and first sample. */
const ANSWER_ms_MAX = 5000;

/** What went wrong on the way to the switch, as opposed to a refusal by the judge. */
export class SwitchSilent extends Error {
  override name = "SwitchSilent";
}

interface Waiting {
  resolve(a: SwitchAnswer): void;
  reject(e: Error): void;
  timer: NodeJS.Timeout;
}

/** A client of the switch. One connection, many questions. */
export class SwitchClient {
  readonly #socket: Socket;
  readonly #waiting = new Map<number, Waiting>();
  #next = 1;
  /** Why the connection ended, for whoever still waits. */
  #why = "The daemon closed the connection before it answered.";
  #onPush: (p: SwitchPush) => void = () => {};
  /** Called once when the connection ends, however it ends. */
  onClose: () => void = () => {};

  private constructor(socket: Socket) {
    this.#socket = socket;
    socket.setEncoding("utf8");
    const cutter = new LineCutter(
      (line) => this.#line(line),
      () => socket.destroy(),
    );
    socket.on("data", (text: string) => cutter.push(text));
    socket.on("error", () => socket.destroy());
    socket.on("close", () => this.#closed());
  }

  /** Connects to the socket at `path`; rejects with SwitchSilent where nobody listens. */
  static connect(path: string): Promise<SwitchClient> {
    return new Promise((resolve, reject) => {
      const socket = connect(path);
      const fail = (error: Error): void =>
        reject(new SwitchSilent(`Nobody answers on ${path} (${error.message}).`));
      socket.once("error", fail);
      socket.once("connect", () => {
        socket.off("error", fail);
        resolve(new SwitchClient(socket));
      });
    });
  }

  /** Asks, and resolves with the answer; rejects with SwitchSilent after 5 s or a lost connection. */
  ask(question: Question): Promise<SwitchAnswer> {
    const id = this.#next++;
    return new Promise((resolve, reject) => {
      if (this.#socket.destroyed) {
        reject(new SwitchSilent(`The daemon has gone; "${question.verb}" was not sent.`));
        return;
      }
      const timer = setTimeout(() => {
        this.#waiting.delete(id);
        reject(
          new SwitchSilent(`No answer to "${question.verb}" within ${ANSWER_ms_MAX / 1000} s.`),
        );
      }, ANSWER_ms_MAX);
      this.#waiting.set(id, { resolve, reject, timer });
      this.#socket.write(`${JSON.stringify({ id, ...question })}\n`);
    });
  }

  /** Asks for every snapshot and event from now on. */
  async watch(onPush: (p: SwitchPush) => void): Promise<void> {
    this.#onPush = onPush;
    await this.ask({ verb: "watch" });
  }

  close(): void {
    this.#socket.end();
  }

  #line(line: string): void {
    const message = messageOf(line);
    if (message === null) {
      this.#why =
        "The daemon says what this program does not understand; is it of another version?";
      this.#socket.destroy();
    } else if ("push" in message) this.#onPush(message);
    else this.#answered(message);
  }

  #answered(answer: SwitchAnswer): void {
    const waiting = this.#waiting.get(answer.id);
    if (waiting === undefined) return;
    this.#waiting.delete(answer.id);
    clearTimeout(waiting.timer);
    waiting.resolve(answer);
  }

  #closed(): void {
    for (const w of this.#waiting.values()) {
      clearTimeout(w.timer);
      w.reject(new SwitchSilent(this.#why));
    }
    this.#waiting.clear();
    this.onClose();
  }
}

/** What the daemon said, or null where it is nothing that this program knows. */
function messageOf(line: string): SwitchPush | SwitchAnswer | null {
  let value: unknown;
  try {
    value = JSON.parse(line);
  } catch {
    return null;
  }
  const push = SwitchPush.safeParse(value);
  if (push.success) return push.data;
  const answer = SwitchAnswer.safeParse(value);
  return answer.success ? answer.data : null;
}
