/** Where everything stands, in CSS pixels. One function of the page's size, so it can be tested. */
export interface Layout {
  readonly width: number;
  readonly height: number;
  readonly phone: boolean;
  /** Size of the small text, px, and of the numbers in the now column. */
  readonly small: number;
  readonly number: number;
  /** Left margin of text. */
  readonly margin: number;
  /** The two hairlines of the section at now. */
  readonly g0: number;
  readonly g1: number;
  /** Corridor, output strip, case strip, line of event words. */
  readonly top: number;
  readonly corridor: number;
  readonly output: readonly [number, number];
  readonly case: readonly [number, number];
  readonly words: number;
}

export const PHONE_PX = 720;
export const WIDE_PX = 1800;
/** Share of the width that belongs to the future. */
const AHEAD = 0.27;

export function layoutFor(width: number, viewport: number): Layout {
  const phone = width < PHONE_PX;
  const wide = width >= WIDE_PX;
  const small = wide ? 15 : 12.5;
  const gutter = phone ? 100 : wide ? 210 : 150;
  const g1 = phone ? width - 92 : Math.round(width * (1 - AHEAD));
  const corridor = phone ? 246 : Math.max(210, Math.round(Math.min(viewport * 0.37, width * 0.28)));
  const strip = phone ? 56 : Math.round(corridor * 0.24);
  const gap = phone ? 24 : wide ? 42 : 34;
  const output0 = corridor + gap;
  const case0 = output0 + strip + gap * 0.8;
  const words = case0 + strip + (phone ? 25 : wide ? 32 : 28);
  return {
    width,
    height: words + 14 + (phone ? 0 : small + 4),
    phone,
    small,
    number: small + (phone ? 0.5 : 2.5),
    margin: phone ? 16 : Math.min(88, Math.max(16, width * 0.036)),
    g0: g1 - gutter,
    g1,
    top: 22,
    corridor,
    output: [output0, output0 + strip],
    case: [case0, case0 + strip],
    words,
  };
}
