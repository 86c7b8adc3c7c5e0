/** Why a controller refuses a line. Indexes are recorded, so new reasons go to the end. */
export const REASONS = [
  "state",
  "version",
  "session",
  "unknown",
  "old",
  "stale",
  "over",
  "term",
  "range",
  "form",
  "capability",
  "key",
  "loop",
  "case",
  "memory",
  "worn",
  "curve",
  "checksum",
  "order",
  "wrong",
  "none",
  "back-off",
  "cause",
  "injected",
  "current",
] as const;
export type Reason = (typeof REASONS)[number];

/** Index of a reason, or −1 for one that this version does not know. */
export const reasonCode = (text: string): number => (REASONS as readonly string[]).indexOf(text);

/** Each reason in words, to follow "refused: ". */
const REASON_WORDS: Readonly<Record<Reason, string>> = {
  state: "the board is in a state where that is not possible",
  version: "the board speaks another version of the protocol",
  session: "the session named is not the open one",
  unknown: "the board no longer knows the sample named",
  old: "the term was over on arrival",
  stale: "a newer sample was named before",
  over: "a number is above the board's limit",
  term: "the term is outside the board's limits",
  range: "a number is outside its range",
  form: "the line was not of its form",
  capability: "the board cannot do that",
  key: "the key is off",
  loop: "the interlock loop is open",
  case: "the case reading is not plausible or over its limit",
  memory: "the board's non-volatile memory cannot be read",
  worn: "the board's boot counter is used up",
  curve: "the board holds no curve",
  checksum: "the checksum did not fit",
  order: "lines came out of order",
  wrong: "the answer was wrong",
  none: "no offer is open",
  "back-off": "too many wrong answers; the board waits 30 seconds",
  cause: "the latched cause is another one",
  injected: "a proof injection is running",
  current: "current still flows",
};

/** A reason in words; an unknown one as it came. */
export const reasonWords = (text: string): string => {
  const known = REASONS.find((reason) => reason === text);
  return known === undefined ? `the board says "${text}"` : REASON_WORDS[known];
};
