/** Placing words where they do not lie on one another. Pure: widths are estimated, not measured. */

/** About how wide a text is, px. Old-book serifs average half their size. */
export const widthOf = (text: string, size: number): number => text.length * size * 0.5;

/**
 * Moves labels apart vertically until neighbours are at least `gap` px from each other, keeping
 * their order, none below `high`; those that had room stay. Ys ascending in, ascending out.
 */
export function spread(ys: readonly number[], gap: number, high: number): number[] {
  const out = [...ys];
  for (let i = 1; i < out.length; i++) out[i] = Math.max(out[i] ?? 0, (out[i - 1] ?? 0) + gap);
  let limit = high;
  for (let i = out.length - 1; i >= 0; i--) {
    out[i] = Math.min(out[i] ?? 0, limit);
    limit = (out[i] ?? 0) - gap;
  }
  return out;
}

export interface Tag {
  readonly x: number;
  readonly text: string;
  /** Higher ones are placed first and push others out. */
  readonly rank: number;
  /** How many rows it may use; the second row is for events that would else be lost. */
  readonly rows?: number;
}

export interface PlacedTag {
  /** Left edge, px. */
  readonly left: number;
  /** 0 or 1: which of the rows under the axis. */
  readonly row: number;
  /** Index into the tags given. */
  readonly index: number;
}

/**
 * Rows of words under the axis: each stands centred at its x where it can, moves inward at the
 * edges, takes the second row where the first is taken, and is left out where both are. Marks stay.
 */
export function placeTags(
  tags: readonly Tag[],
  size: number,
  within: { readonly from: number; readonly to: number; readonly rows: number },
): PlacedTag[] {
  const taken: { from: number; to: number }[][] = Array.from({ length: within.rows }, () => []);
  const order = tags.map((tag, index) => ({ tag, index }));
  order.sort((a, b) => b.tag.rank - a.tag.rank || a.tag.x - b.tag.x);
  const placed: PlacedTag[] = [];
  for (const { tag, index } of order) {
    const width = widthOf(tag.text, size);
    if (width > within.to - within.from) continue;
    // The same words twice say nothing more; the marks stand at both.
    if (placed.some((other) => tags[other.index]?.text === tag.text)) continue;
    const left = Math.min(Math.max(tag.x - width / 2, within.from), within.to - width);
    const row = taken.findIndex(
      (row, i) =>
        i < (tag.rows ?? within.rows) &&
        row.every(({ from, to }) => left > to + size || left + width < from - size),
    );
    if (row < 0) continue;
    taken[row]?.push({ from: left, to: left + width });
    placed.push({ left, row, index });
  }
  return placed;
}
