import { createServer } from "node:net";
import { codeOf, EXIT, reasonOf, Trouble } from "./say.ts";
import { lives, notices } from "./where.ts";

/**
 * Looks whether the page's port can be had, before anything is started. Between this and the desk's
 * own listening somebody may still take it; the desk then says so.
 */
export async function wantPort(host: string, port: number): Promise<void> {
  try {
    await tryListening(host, port);
  } catch (error) {
    throw addressTrouble(error, host, port);
  }
}

/** Why an address cannot be listened on, and what to do. */
export function addressTrouble(error: unknown, host: string, port: number): Trouble {
  switch (codeOf(error)) {
    case "EADDRINUSE": {
      const owner = notices().find((n) => lives(n) && n.page.endsWith(`:${port}/`));
      const by = owner === undefined ? "another program" : `the daemon of bench ${owner.bench}`;
      return new Trouble(
        `Port ${port} of ${host}, wanted for the page, is in use by ${by}.`,
        "Name another with --port NUMBER, or --port 0 for any free one. Nothing was started.",
      );
    }
    case "EACCES":
      return new Trouble(
        `Port ${port} may not be used by this user.`,
        "Name one above 1023 with --port. Nothing was started.",
      );
    case "EADDRNOTAVAIL":
    case "ENOTFOUND":
    case "EINVAL":
    case "EAI_AGAIN":
      return new Trouble(
        `--listen ${host} is no address of this computer.`,
        "Write one that it has, or 0.0.0.0 for all of them. Nothing was started.",
        EXIT.usage,
      );
    default:
      return new Trouble(
        `Port ${port} of ${host} cannot be listened on: ${reasonOf(error)}.`,
        "Name another with --port or --listen. Nothing was started.",
      );
  }
}

function tryListening(host: string, port: number): Promise<void> {
  const server = createServer();
  return new Promise((resolve, reject) => {
    server.once("error", reject);
    server.listen(port, host, () => server.close(() => resolve()));
  });
}

/** The dark port answers wherever the page does, and always on this machine. */
export function darkHosts(listen: string | null): string[] {
  if (listen === null) return ["127.0.0.1"];
  return listen === "0.0.0.0" || listen === "::" ? [listen] : ["127.0.0.1", listen];
}
