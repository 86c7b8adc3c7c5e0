import { lineAt, nameOf, parse, type Source, type SyntaxNode, walk } from "./sources.ts";

export const FILE_LINES_MAX = 400;
export const FUNCTION_LINES_MAX = 60;
const COMMAND_LINES_MAX = 120;
export const WORKER_LINES_MAX = 15;

/** Most lines that a file may have, by what it is. */
function linesMax({ path, text }: Source): number {
  if (/^daemon\/.+\/(worker|process|[a-z]+-worker)\.ts$/.test(path)) return WORKER_LINES_MAX;
  const isCommand = path.startsWith("daemon/cli/") && /from "commander"/.test(text);
  return isCommand ? COMMAND_LINES_MAX : FILE_LINES_MAX;
}

const countLines = (text: string): number => text.trimEnd().split("\n").length;

/** A file that is longer than its kind may be, in words; null where it is not. */
export function tooLong(source: Source): string | null {
  const lines = countLines(source.text);
  const max = linesMax(source);
  return lines > max
    ? `${source.path} has ${lines} lines, ${max} are allowed: split it by concern`
    : null;
}

const FUNCTIONS = new Set([
  "FunctionDeclaration",
  "FunctionExpression",
  "ArrowFunctionExpression",
  "MethodDefinition",
]);

/** Functions of a TypeScript source that are too long to read at once. */
export function longFunctions(source: Source): string[] {
  const found: string[] = [];
  walk(parse(source), (node, parent) => {
    if (!FUNCTIONS.has(node.type) || parent?.type === "MethodDefinition") return;
    const lines = countLines(source.text.slice(node.start, node.end));
    if (lines > FUNCTION_LINES_MAX) found.push(longFunction(source, node, parent, lines));
  });
  return found;
}

function longFunction(
  source: Source,
  node: SyntaxNode,
  parent: SyntaxNode | null,
  lines: number,
): string {
  const name = nameOf(node.id) ?? nameOf(node.key) ?? nameOf(parent?.id) ?? "a function";
  const place = `${source.path}:${lineAt(source.text, node.start)}`;
  return `${place} ${name} has ${lines} lines, ${FUNCTION_LINES_MAX} are allowed`;
}

/** Functions of a C source that are too long: from an opening brace in column 1 to its closing. */
export function longFunctionsInC({ path, text }: Source): string[] {
  const found: string[] = [];
  let begun = -1;
  text.split("\n").forEach((line, index) => {
    if (/^(\{|[a-z].*\)\s*\{)\s*$/.test(line)) begun = index;
    if (/^\}\s*$/.test(line) && begun >= 0) {
      const lines = index - begun + 1;
      if (lines > FUNCTION_LINES_MAX) {
        found.push(`${path}:${begun + 1} is a function of ${lines} lines`);
      }
      begun = -1;
    }
  });
  return found;
}
