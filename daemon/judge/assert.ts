/** A broken invariant of the judge: always our own bug, never the world's doing. */
export class JudgeDefect extends Error {
  override readonly name = "JudgeDefect";
}

/**
 * States what must hold. Where it does not, the step ends here and no permit leaves it; the caller
 * sends dark with cause 87 (host-defect) and the bench stays latched.
 * @throws JudgeDefect naming what did not hold
 */
export function assert(holds: boolean, what: string): void {
  if (!holds) throw new JudgeDefect(`this must always hold in the judge: ${what}`);
}
