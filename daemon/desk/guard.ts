import { isIP } from "node:net";

/**
 * Which requests may be looked at at all, before any sign-in: a page of another site must neither
 * reach this desk under a borrowed name (its own name pointed at this address) nor post to it.
 */

/** Addresses only this machine can come from. */
export const isLoopback = (address: string): boolean =>
  address === "::1" || /^(::ffff:)?127(\.\d{1,3}){3}$/.test(address);

/** Host names that mean this machine to itself. */
const LOCAL_NAMES = new Set(["localhost", "127.0.0.1", "[::1]"]);

/** The name part of a Host header, lower case, brackets kept; undefined where it is malformed. */
export function hostName(header: string | undefined): string | undefined {
  const match = /^(\[[0-9a-f:.]+\]|[a-z0-9.-]+)(?::\d{1,5})?$/.exec((header ?? "").toLowerCase());
  return match?.[1];
}

/**
 * Whether a Host header names this desk. A plain address cannot be a borrowed name, so any address
 * is allowed once the desk listens beyond this machine; other names must have been listed.
 */
export function hostAllowed(
  header: string | undefined,
  reach: { readonly listensBeyond: boolean; readonly names: readonly string[] },
): boolean {
  const name = hostName(header);
  if (name === undefined) return false;
  if (LOCAL_NAMES.has(name)) return true;
  if (!reach.listensBeyond) return false;
  return isIP(name.replace(/^\[|\]$/g, "")) !== 0 || reach.names.includes(name);
}

/** Whether an Origin header, where there is one, is this desk's own origin under that Host. */
export function originAllowed(origin: string | undefined, host: string): boolean {
  return origin === undefined || origin.toLowerCase() === `http://${host.toLowerCase()}`;
}

/** Who asks the switch, by where the request came from and how it proved itself. */
export function askerOf(address: string, proof: "cookie" | "token"): "page" | "script" | "away" {
  if (!isLoopback(address)) return "away";
  return proof === "cookie" ? "page" : "script";
}

/** What a page may load: itself, and the dark port of the same machine. No inline script or style. */
export function contentPolicy(host: string, darkPort: number, styleHash = ""): string {
  const dark = darkPort > 0 ? ` http://${hostName(host) ?? "127.0.0.1"}:${darkPort}` : "";
  const style = styleHash === "" ? "'self'" : `'sha256-${styleHash}'`;
  return [
    "default-src 'none'",
    "script-src 'self'",
    `style-src ${style}`,
    "img-src 'self' data:",
    `connect-src 'self' ws://${host}${dark}`,
    "form-action 'self'",
    "base-uri 'none'",
    "frame-ancestors 'none'",
  ].join("; ");
}
