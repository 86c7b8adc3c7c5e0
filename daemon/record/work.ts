/** How far a long piece of work has come; both in the same unit, whatever it is. */
export interface Done {
  readonly done: number;
  readonly total: number;
}

/**
 * A long piece of work that somebody else drives, a short step at a time: the recorder between two
 * looks at its ring, a command between two signals. Ending it early (`return`) leaves nothing half.
 */
export type Work<T> = Generator<Done, T>;
