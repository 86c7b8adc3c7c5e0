import { readdirSync, readFileSync } from "node:fs";
import { parseAst } from "rolldown/parseAst";
import { packageRoot } from "../../daemon/paths.ts";

/** A node of the syntax tree, as far as these tests look into it. */
export interface SyntaxNode {
  readonly type: string;
  readonly start: number;
  readonly end: number;
  readonly [key: string]: unknown;
}

/** One source file: path from the package root with forward slashes, and its text. */
export interface Source {
  readonly path: string;
  readonly text: string;
}

export const ROOMS = ["daemon", "firmware-protocol", "dashboards", "test"] as const;
/** Made by builds and tests, not written by anybody. */
const NOT_SOURCE = new Set(["node_modules", "dist", "build", "artefacts", "coverage"]);

function* pathsBelow(folder: string): Generator<string> {
  for (const entry of readdirSync(`${packageRoot}/${folder}`, { withFileTypes: true })) {
    const path = `${folder}/${entry.name}`;
    if (entry.isDirectory() && !NOT_SOURCE.has(entry.name)) yield* pathsBelow(path);
    else if (entry.isFile()) yield path;
  }
}

/** Paths of all files of these folders whose name ends so, sorted. */
export function pathsOf(folders: readonly string[], endings: readonly string[]): string[] {
  const all = folders.flatMap((folder) => [...pathsBelow(folder)]);
  return all.filter((path) => endings.some((ending) => path.endsWith(ending))).sort();
}

export const readSource = (path: string): Source => ({
  path,
  text: readFileSync(`${packageRoot}/${path}`, "utf8"),
});

/** All TypeScript of these folders. */
export const typescriptOf = (...folders: readonly string[]): Source[] =>
  pathsOf(folders, [".ts", ".tsx"]).map(readSource);

/** Whether a value found in a syntax tree is a node of it. */
export const isNode = (value: unknown): value is SyntaxNode =>
  typeof value === "object" && value !== null && "type" in value && typeof value.type === "string";

/** Syntax tree of a TypeScript or JavaScript source. Throws where it does not parse. */
export function parse({ path, text }: Source): SyntaxNode {
  const lang = path.endsWith(".tsx") ? "tsx" : path.endsWith(".ts") ? "ts" : "js";
  const tree: unknown = parseAst(text, { lang }, path);
  if (!isNode(tree)) throw new Error(`${path} gave no syntax tree`);
  return tree;
}

/** The direct children of a node with the name of the field that holds each. */
export function* childrenOf(node: SyntaxNode): Generator<readonly [string, SyntaxNode]> {
  for (const [key, value] of Object.entries(node)) {
    if (isNode(value)) yield [key, value];
    else if (Array.isArray(value)) {
      for (const item of value) if (isNode(item)) yield [key, item];
    }
  }
}

/** Visits a node and everything below it; `parent` and `key` say where each hangs. */
export function walk(
  node: SyntaxNode,
  visit: (node: SyntaxNode, parent: SyntaxNode | null, key: string) => void,
): void {
  const pending: [SyntaxNode, SyntaxNode | null, string][] = [[node, null, ""]];
  for (let next = pending.pop(); next !== undefined; next = pending.pop()) {
    visit(...next);
    for (const [key, child] of childrenOf(next[0])) pending.push([child, next[0], key]);
  }
}

/** Line of a place in a text, from 1. */
export const lineAt = (text: string, index: number): number =>
  text.slice(0, index).split("\n").length;

/** A name that a node carries, as an identifier or a string literal. */
export function nameOf(node: unknown): string | null {
  if (!isNode(node)) return null;
  if (node.type === "Identifier" && typeof node.name === "string") return node.name;
  if (node.type === "Literal" && typeof node.value === "string") return node.value;
  return null;
}
