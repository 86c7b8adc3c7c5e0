import { posix } from "node:path";
import { isNode, parse, type Source, type SyntaxNode, walk } from "./sources.ts";

/** One import, re-export, dynamic import or import type of a file. */
export interface Import {
  readonly from: string;
  /** Package or `node:` name as written, or the imported file's path from the package root. */
  readonly to: string;
  /** Erased by the compiler: nothing of it is loaded at run time. */
  readonly typeOnly: boolean;
}

/** What a dynamic import of a computed name is listed as: no table can allow it. */
export const COMPUTED = "(computed)";

const IMPORTING = new Set([
  "ImportDeclaration",
  "ExportNamedDeclaration",
  "ExportAllDeclaration",
  "ImportExpression",
  "TSImportType",
]);

/**
 * All imports of a source. `import { type A }` is no type-only import: under verbatimModuleSyntax
 * the file is still loaded.
 */
export function importsOf(source: Source): Import[] {
  const found: Import[] = [];
  walk(parse(source), (node) => {
    if (!IMPORTING.has(node.type) || (node.source == null && node.type !== "ImportExpression")) {
      return;
    }
    found.push({
      from: source.path,
      to: resolve(source.path, literal(node.source)),
      typeOnly: isTypeOnly(node),
    });
  });
  return found;
}

/** The text of a string literal; null for anything that is only known while running. */
const literal = (node: unknown): string | null =>
  isNode(node) && node.type === "Literal" && typeof node.value === "string" ? node.value : null;

const isTypeOnly = (node: SyntaxNode): boolean =>
  node.type === "TSImportType" || node.importKind === "type" || node.exportKind === "type";

function resolve(from: string, specifier: string | null): string {
  if (specifier === null) return COMPUTED;
  if (!specifier.startsWith(".")) return specifier;
  return posix.normalize(posix.join(posix.dirname(from), specifier));
}

/** `@scope/name/deep` → `@scope/name`; a `node:` name stays whole. */
export function packageOf(specifier: string): string {
  if (specifier.startsWith("node:")) return specifier;
  const parts = specifier.split("/");
  return parts.slice(0, specifier.startsWith("@") ? 2 : 1).join("/");
}
