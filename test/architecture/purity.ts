import { lineAt, parse, type Source, type SyntaxNode, walk } from "./sources.ts";

/** What a pure room may not touch, each with what to use instead. */
const IMPURE: ReadonlyMap<string, string> = new Map([
  ["setTimeout", "return the next deadline"],
  ["setInterval", "return the next deadline"],
  ["setImmediate", "return the next deadline"],
  ["queueMicrotask", "return the next deadline"],
  ["Date", "take the time as an argument"],
  ["performance", "take the time as an argument"],
  ["crypto", "take random bytes as an argument"],
  ["process", "take what you need as an argument"],
  ["console", "return what is to be told"],
  ["fetch", "take the data as an argument"],
  ["Buffer", "use Uint8Array"],
  ["globalThis", "take what you need as an argument"],
  ["require", "import it, where the table allows"],
]);

/** Whether this identifier reads a variable, and is not merely a property or key of that name. */
function isReference(parent: SyntaxNode | null, key: string): boolean {
  if (parent === null) return false;
  if (key === "property" && parent.type === "MemberExpression") return parent.computed === true;
  if (key === "key") return parent.computed === true;
  if (parent.type === "TSQualifiedName" && key === "right") return false;
  return !(parent.type === "ImportSpecifier" || parent.type === "ExportSpecifier");
}

/** Every use of clock, timer, randomness, process or console in a source, in words. */
export function impurities(source: Source): string[] {
  const found: string[] = [];
  const tell = (node: SyntaxNode, what: string, remedy: string): void => {
    found.push(`${source.path}:${lineAt(source.text, node.start)} uses ${what}; ${remedy}`);
  };
  walk(parse(source), (node, parent, key) => {
    if (node.type === "Identifier" && typeof node.name === "string" && isReference(parent, key)) {
      const remedy = IMPURE.get(node.name);
      if (remedy !== undefined) tell(node, node.name, remedy);
    }
    if (
      node.type === "MemberExpression" &&
      /^Math\s*(\.\s*random|\[)/.test(source.text.slice(node.start, node.end))
    ) {
      tell(node, "Math.random", "take a seeded generator as an argument");
    }
  });
  return found;
}
