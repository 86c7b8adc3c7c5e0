/**
 * Dark from a page: both ways at once, neither waiting for the other. The first is the desk, which
 * asks the switch; the second is the port of the judging thread that knows nothing but dark and
 * works while the desk is stopped.
 */
export interface WayAnswer {
  /** `asked` until it answers; then what came of it. */
  readonly is: "asked" | "dark" | "refused" | "silent";
  /** Its own sentence, or why there is none. */
  readonly words: string;
  /** When it answered, ms since 1970. */
  readonly at: number;
}

export interface DarkAsked {
  readonly at: number;
  readonly desk: WayAnswer;
  readonly port: WayAnswer;
}

export type Way = "desk" | "port";

/** A way that says nothing for this long has failed, ms. The other one has long answered by then. */
export const WAY_ms_MAX = 2500;

export type Post = (address: string, signal: AbortSignal) => Promise<Response>;

const asked: WayAnswer = { is: "asked", words: "", at: 0 };

async function go(address: string, post: Post, now: () => number): Promise<WayAnswer> {
  try {
    const response = await post(address, AbortSignal.timeout(WAY_ms_MAX));
    const { ok, words } = (await response.json()) as { ok: boolean; words: string };
    return { is: ok ? "dark" : "refused", words, at: now() };
  } catch (error) {
    return { is: "silent", words: error instanceof Error ? error.message : "", at: now() };
  }
}

/**
 * Fires both ways and tells every change. An empty address means that there is no such way here.
 * Resolves when both have answered or failed.
 */
export async function goDark(
  ways: { readonly desk: string; readonly port: string },
  post: Post,
  now: () => number,
  tell: (state: DarkAsked) => void,
): Promise<DarkAsked> {
  let state: DarkAsked = { at: now(), desk: asked, port: asked };
  tell(state);
  const one = async (way: Way): Promise<void> => {
    const answer: WayAnswer =
      ways[way] === ""
        ? { is: "silent", words: "there is no second way here", at: now() }
        : await go(ways[way], post, now);
    state = { ...state, [way]: answer };
    tell(state);
  };
  await Promise.all([one("port"), one("desk")]);
  return state;
}
