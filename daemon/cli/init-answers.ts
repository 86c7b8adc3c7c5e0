import { createInterface } from "node:readline/promises";
import {
  type InitAnswers,
  PROTECTION_KEYS,
  type ProtectionKey,
} from "../bench-file/init/answers.ts";
import { parseQuantity } from "../model/quantities.ts";
import { QUESTIONS, type Question, refusal } from "./init-questions.ts";
import { EXIT, Trouble } from "./say.ts";

/** Answers as texts, by the question's key; "" stands for not known. */
export type Answers = Readonly<Record<string, string>>;

/**
 * Every answer: what was given, what a board or a guess told, and the rest asked at the terminal.
 * Without a terminal the rest is usual, and what has no usual value is a Trouble that names it.
 */
export async function collect(given: Answers, told: Answers): Promise<Answers> {
  for (const question of QUESTIONS) {
    const answer = given[question.key];
    const why = answer === undefined ? null : refusal(question, answer);
    if (why !== null) {
      throw new Trouble(`--${question.key}: ${why}`, "Nothing was written.", EXIT.usage);
    }
  }
  const open = QUESTIONS.filter(({ key }) => given[key] === undefined && told[key] === undefined);
  const known = { ...told, ...given };
  if (process.stdin.isTTY) return { ...known, ...(await askAll(open)) };
  const missing = open.filter(({ usual }) => usual === null);
  if (missing.length > 0) {
    throw new Trouble(
      `Not told: ${missing.map(({ key, ask }) => `--${key} (${ask})`).join(", ")}.`,
      "Give these as options, or call it at a terminal, where it asks. Nothing was written.",
      EXIT.usage,
    );
  }
  return { ...known, ...Object.fromEntries(open.map(({ key, usual }) => [key, usual ?? ""])) };
}

async function askAll(open: readonly Question[]): Promise<Answers> {
  const reader = createInterface({ input: process.stdin, output: process.stderr });
  const ended = new AbortController();
  reader.once("close", () => ended.abort());
  const answers: Record<string, string> = {};
  try {
    for (const question of open) answers[question.key] = await askOne(reader, question, ended);
    return answers;
  } catch (error) {
    if (!ended.signal.aborted) throw error;
    throw new Trouble("Left before the last answer.", "Nothing was written.", EXIT.refused);
  } finally {
    reader.close();
  }
}

async function askOne(
  reader: ReturnType<typeof createInterface>,
  question: Question,
  ended: AbortController,
): Promise<string> {
  const { ask, usual } = question;
  const end = usual === null ? "" : usual === "" ? " [not known]" : ` [${usual}]`;
  for (;;) {
    const prompt = `${ask.charAt(0).toUpperCase()}${ask.slice(1)}${end}: `;
    const typed = (await reader.question(prompt, { signal: ended.signal })).trim();
    const why = refusal(question, typed);
    if (why === null) return typed === "" ? (usual ?? "") : typed;
    process.stderr.write(`${why}\n`);
  }
}

/** The answers as numbers. Each was looked at by `collect` before. */
export function toInit(answers: Answers, stream: readonly string[] | null): InitAnswers {
  const value = (key: string): number | null => {
    const form = QUESTIONS.find((question) => question.key === key)?.form;
    if (form === undefined || "pattern" in form || (answers[key] ?? "") === "") return null;
    const parsed = parseQuantity(form.kind, answers[key] ?? "");
    return parsed.ok ? parsed.value : null;
  };
  const must = (key: string): number => value(key) ?? Number.NaN;
  const r25_ohm = value("thermistor");
  return {
    name: answers.name ?? "",
    title: answers.title ?? "",
    connect: connectOf(answers.path ?? "", must("baud")),
    board: answers.board ?? "any",
    rate_perS: must("rate"),
    wavelength_nm: must("wavelength"),
    threshold_mA: must("threshold"),
    slope_mWpermA: must("slope"),
    at_degC: must("at"),
    operating_mA: must("current"),
    operating_mV: value("voltage"),
    absolute_mA: must("absolute"),
    case_degC_min: must("case-min"),
    case_degC_max: must("case-max"),
    drift_nmPerK: value("drift"),
    thermistor:
      r25_ohm === null
        ? null
        : { r25_ohm, beta_K: must("beta"), fixed_ohm: must("fixed"), full_counts: must("full") },
    photodiode_mW: value("photodiode"),
    stream,
    protections: protectionsOf(answers.has ?? "none"),
  };
}

function connectOf(path: string, baud: number): InitAnswers["connect"] {
  const tcp = /^([A-Za-z0-9.-]+):(\d{1,5})$/.exec(path);
  if (tcp === null) return { kind: "serial", path, baud };
  return { kind: "tcp", host: tcp[1] ?? "", port: Number(tcp[2]) };
}

function protectionsOf(text: string): Record<ProtectionKey, boolean> {
  const words = text === "none" ? [] : text.split(",").map((word) => word.trim());
  const strange = words.find((word) => !PROTECTION_KEYS.some((key) => key === word));
  if (strange !== undefined) {
    throw new Trouble(
      `"${strange}" is none of ${PROTECTION_KEYS.join(", ")}.`,
      "Write those that the bench has, with commas between. Nothing was written.",
      EXIT.usage,
    );
  }
  const has = (key: ProtectionKey): [ProtectionKey, boolean] => [key, words.includes(key)];
  return Object.fromEntries(PROTECTION_KEYS.map(has)) as Record<ProtectionKey, boolean>;
}
