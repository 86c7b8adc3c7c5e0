/**
 * What stands between here and the second home, in sentences. "later": asked again after a pause.
 * "split": too much at once. "refused": this very content is not taken, however often it is sent.
 */
export class HomeTrouble extends Error {
  readonly kind: "later" | "split" | "refused";
  constructor(kind: HomeTrouble["kind"], words: string) {
    super(words);
    this.name = "HomeTrouble";
    this.kind = kind;
  }
}

/** Where a server is, for sentences. */
export interface ServerName {
  readonly url: string;
  readonly database: string;
}

/** A fault of the network or the server as a HomeTrouble: what it is, and what to do. */
export function troubleOf(error: unknown, { url, database }: ServerName): HomeTrouble {
  if (error instanceof HomeTrouble) return error;
  const found = error instanceof Error ? error.message : String(error);
  const status = statusOf(error);
  const code = codeOf(error);
  if (status === 401 || status === 403) {
    return new HomeTrouble(
      "later",
      `${url} does not let this user in (${status}). Put the right user and password into the environment or the credentials file; they are read again each time.`,
    );
  }
  if (status === 404) {
    return new HomeTrouble(
      "later",
      `${url} has no database "${database}", or not its retention policy (404: ${serverWords(found)}). Create it there, or give this user the right to; it is asked again.`,
    );
  }
  if (status === 413) return new HomeTrouble("split", `${url} takes no body of that size (413).`);
  if (status === 400 || status === 422) {
    return new HomeTrouble("refused", `${url} refuses a point: ${serverWords(found)}.`);
  }
  if (status > 0) {
    return new HomeTrouble(
      "later",
      `${url} answers ${status}: ${serverWords(found)}. It is asked again.`,
    );
  }
  if (/CERT|SSL|TLS|SIGNED|SIGNATURE|ALTNAME/.test(code)) {
    return new HomeTrouble(
      "later",
      `The certificate of ${url} is not believed (${code}). Name the file of its authority as ca-file in the bench file.`,
    );
  }
  if (code !== "") {
    return new HomeTrouble(
      "later",
      `${url} does not answer (${code}). It is asked again; the record keeps what is to be sent.`,
    );
  }
  return new HomeTrouble(
    "later",
    `${url} cannot serve now (${found}). It is asked again; the record keeps what is to be sent.`,
  );
}

/** Status of a refused request; 0 where there was no answer. */
function statusOf(error: unknown): number {
  const status = (error as { res?: { statusCode?: unknown } } | null)?.res?.statusCode;
  return typeof status === "number" ? status : 0;
}

function codeOf(error: unknown): string {
  const code = (error as { code?: unknown } | null)?.code;
  return typeof code === "string" ? code : "";
}

/** What the server itself said, out of its JSON; at most a line. */
function serverWords(message: string): string {
  const json = /\{.*\}/s.exec(message)?.[0];
  if (json !== undefined) {
    try {
      const { error } = JSON.parse(json) as { error?: unknown };
      if (typeof error === "string") return error.slice(0, 300);
    } catch {
      // A body cut short is told as it came.
    }
  }
  return message.replaceAll(/\s+/g, " ").slice(0, 300);
}

/** How many points an answer says were dropped from an otherwise accepted body; null where none was. */
export function partlyDropped(
  error: unknown,
): { readonly dropped: number; readonly words: string } | null {
  if (statusOf(error) !== 400) return null;
  const words = serverWords(error instanceof Error ? error.message : "");
  if (!words.includes("partial write")) return null;
  const dropped = /dropped=(\d+)/.exec(words)?.[1];
  return { dropped: dropped === undefined ? 1 : Number(dropped), words };
}
