/** What can make the ceiling. Codes are recorded, so they are never reused. */
export const MAKERS = [
  "derating",
  "junction",
  "bench",
  "user",
  "plan",
  "hazard",
  "unattended",
  "board",
] as const;
export type Maker = (typeof MAKERS)[number];
export const makerCode = (maker: Maker): number => MAKERS.indexOf(maker);
export const makerOf = (code: number): Maker => MAKERS[code] ?? "bench";

/** How a maker is named to people, to follow "held down by". */
export const MAKER_WORDS: Record<Maker, string> = {
  derating: "the derating for the case",
  junction: "the junction limit",
  bench: "the bench limit",
  user: "the limit asked for",
  plan: "the plan's limit",
  hazard: "a hazard",
  unattended: "the limit while unattended",
  board: "the board's own limit",
};
