import {
  type Document,
  isAlias,
  isMap,
  isPair,
  isScalar,
  isSeq,
  LineCounter,
  type Node,
  Parser,
  parseDocument,
} from "yaml";
import { type Path, type Problem, pathWords } from "./problem.ts";
import { placeAt } from "./text.ts";

/** Deepest nesting read. A bench file needs five levels. */
export const NESTING_MAX = 16;

/** YAML as it stands in the file: every scalar is its text, and every value knows its place. */
export type Tree = string | TreeMap | readonly Tree[];
export interface TreeMap {
  readonly [key: string]: Tree;
}

export interface Read {
  readonly tree: Tree | null;
  readonly problems: readonly Problem[];
  /** Offset of the value at a path, or of the key before it; where there is none, of what holds it. */
  readonly offsetOf: (path: Path, part: "key" | "value") => number;
}

/**
 * Reads YAML into text-only values. Aliases, tags and merge keys are refused: a value then stands in
 * exactly one place, and no file can grow on reading. Never throws.
 */
export function readTree(text: string): Read {
  const deep = findTooDeep(text);
  if (deep !== -1) {
    const words = {
      found: `more than ${NESTING_MAX} levels of nesting`,
      wanted: "a bench file, which has at most five",
      do: "take out the nested brackets or indents here",
    };
    const problem = problemAt(text, "nesting", [], deep, words);
    return { tree: null, problems: [problem], offsetOf: () => deep };
  }
  const counter = new LineCounter();
  const doc = parseDocument(text, {
    schema: "failsafe",
    lineCounter: counter,
    prettyErrors: false,
    uniqueKeys: true,
    logLevel: "error",
  });
  const walk = new Walk(text);
  for (const problem of syntaxProblems(text, doc)) walk.problems.push(problem);
  const whole = walk.problems.length > 0 ? null : walk.value(doc.contents, []);
  // The walk itself may have met an alias or a strange key: then what it made is not the file.
  const tree = walk.problems.length > 0 ? null : whole;
  return { tree, problems: walk.problems, offsetOf: (path, part) => walk.offsetOf(path, part) };
}

function syntaxProblems(text: string, doc: Document): Problem[] {
  return [...doc.errors, ...doc.warnings].map((error) => {
    // The package ends some messages with a period or a colon and an excerpt; one line is enough.
    const message = (error.message.split("\n")[0] ?? "").replace(/[.:]$/, "");
    return problemAt(text, "yaml", [], error.pos[0], {
      found: `text that is not YAML here (${message})`,
      wanted: "YAML: keys and values in indented lines",
      do: yamlAdvice(error.code),
    });
  });
}

function yamlAdvice(code: string): string {
  if (code === "DUPLICATE_KEY") return "keep one of the two, and take the other out";
  if (code === "TAB_AS_INDENT") return "indent with spaces";
  if (code === "MULTIPLE_DOCS") return "keep one bench a file";
  if (code === "TAG_RESOLVE_FAILED") return "take out the tag (the word with !)";
  return "look at this line and the one before it: an indent, a colon, a bracket or a quote";
}

class Walk {
  readonly problems: Problem[] = [];
  private readonly text: string;
  private readonly values = new Map<string, number>();
  private readonly keys = new Map<string, number>();

  constructor(text: string) {
    this.text = text;
  }

  offsetOf(path: Path, part: "key" | "value"): number {
    for (let length = path.length; length >= 0; length -= 1) {
      const at = JSON.stringify(path.slice(0, length));
      const key = this.keys.get(at);
      const value = this.values.get(at);
      // What should hold a missing value is named by its key: the map itself begins a line later.
      const keyFirst = part === "key" || length < path.length;
      const offset = keyFirst ? (key ?? value) : (value ?? key);
      if (offset !== undefined) return offset;
    }
    return 0;
  }

  /** Recursion is bounded: `findTooDeep` has refused anything deeper than NESTING_MAX. */
  value(node: Node | null, path: Path): Tree {
    const offset = node?.range?.[0];
    if (offset !== undefined) this.values.set(JSON.stringify(path), offset);
    if (node === null) return "";
    if (isScalar(node)) return String(node.value ?? "");
    if (isMap(node)) return this.map(node.items, path);
    if (isSeq(node)) {
      return node.items.map((item, index) => this.value(item as Node | null, [...path, index]));
    }
    if (isAlias(node)) {
      this.refuse("alias", path, offset, {
        found: `the alias *${node.source}`,
        wanted: "the value itself",
        do: "write the value out here; bench files have no aliases",
      });
    }
    return "";
  }

  private map(items: readonly unknown[], path: Path): TreeMap {
    const out: Record<string, Tree> = Object.create(null);
    for (const pair of items) {
      if (!isPair(pair)) continue;
      const key = pair.key;
      if (!isScalar(key)) {
        this.refuse("key", path, (key as Node | null)?.range?.[0], {
          found: "a key that is a list, a map or an alias",
          wanted: "a plain word",
          do: "write the key as one word",
        });
        continue;
      }
      const name = String(key.value ?? "");
      const below = [...path, name];
      this.keys.set(JSON.stringify(below), key.range?.[0] ?? 0);
      const value = pair.value as Node | null;
      const empty = isScalar(value) && value.value === "" && value.range?.[0] === value.range?.[1];
      out[name] = empty ? "" : this.value(value, below);
    }
    return out;
  }

  private refuse(
    code: string,
    path: Path,
    offset: number | undefined,
    words: { found: string; wanted: string; do: string },
  ): void {
    this.problems.push(
      problemAt(this.text, code, path, offset ?? this.offsetOf(path, "value"), words),
    );
  }
}

export function problemAt(
  text: string,
  code: string,
  path: Path,
  offset: number,
  words: { found: string; wanted: string; do: string },
): Problem {
  return { level: "error", code, path: pathWords(path), ...placeAt(text, offset), ...words };
}

/**
 * Offset of the first token nested deeper than NESTING_MAX, or −1. The package's own reader builds
 * nodes by recursion, so a megabyte of brackets would end the call stack: this walk has its own.
 */
function findTooDeep(text: string): number {
  const pending: { token: unknown; depth: number }[] = [];
  for (const token of new Parser().parse(text)) pending.push({ token, depth: 0 });
  for (let next = pending.pop(); next !== undefined; next = pending.pop()) {
    const { token, depth } = next;
    if (typeof token !== "object" || token === null) continue;
    const part = token as { items?: unknown; value?: unknown; key?: unknown; offset?: unknown };
    const holds = Array.isArray(part.items);
    if (holds && depth >= NESTING_MAX) return typeof part.offset === "number" ? part.offset : 0;
    const below = holds ? depth + 1 : depth;
    if (holds)
      for (const item of part.items as unknown[]) pending.push({ token: item, depth: below });
    pending.push({ token: part.value, depth: below }, { token: part.key, depth: below });
  }
  return -1;
}
