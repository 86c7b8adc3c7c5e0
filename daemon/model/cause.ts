/**
 * Why light was cut: the codes that travel in `dark`, `sample` and `reset` lines.
 * PROTOCOL.md has the same table; a test compares the two and core.h. Codes are never reused.
 */
export interface Cause {
  readonly code: number;
  /** Stable identifier, used in events, JSON answers and the bench file. */
  readonly id: string;
  /** Completes "north went dark because …". */
  readonly words: string;
  readonly by: "person" | "board" | "host";
  /** Whether this dark latches. Only an order by a person and an idle fall-back do not. */
  readonly latches: boolean;
}

const cause = (
  code: number,
  id: string,
  words: string,
  by: Cause["by"],
  latches = true,
): Cause => ({ code, id, words, by, latches });

export const CAUSES: readonly Cause[] = [
  cause(0, "person", "a person asked for dark", "person", false),
  cause(1, "armed-idle", "it stood armed without current for two minutes", "board", false),
  cause(2, "permit-expired", "the host's permit ran out", "board"),
  cause(3, "second-introduction", "a host introduced itself while the board was armed", "board"),
  cause(4, "bare-dark", "an unchecked dark reached the board (bare line, 0x18 or break)", "board"),
  cause(5, "power-lost", "reset or power lost while armed", "board"),
  cause(6, "watchdog", "the board's watchdog ended a hung main loop", "board"),
  cause(7, "brown-out", "the board's supply dipped and reset it", "board"),
  cause(8, "board-over-ceiling", "measured current passed the ceiling", "board"),
  cause(9, "board-over-aim", "measured current rose above its aim", "board"),
  cause(10, "board-dark-current", "current flowed while the bench was dark", "board"),
  cause(11, "board-case-over", "the case passed its limit", "board"),
  cause(12, "board-case-open", "the case sensor reads open", "board"),
  cause(13, "board-case-short", "the case sensor reads shorted", "board"),
  cause(14, "board-supply-low", "the supply fell too low", "board"),
  cause(15, "board-supply-high", "the supply rose too high", "board"),
  cause(16, "key-off", "the key was turned off", "board"),
  cause(17, "loop-open", "the interlock loop opened", "board"),
  cause(18, "converter-stopped", "the board's converter stopped", "board"),
  cause(19, "memory-unreadable", "the board's non-volatile memory cannot be read", "board"),
  cause(20, "curve-damaged", "the board's copy of the derating curve is damaged", "board"),
  cause(21, "board-defect", "the board's program found itself in an impossible state", "board"),
  cause(64, "case-over", "the case passed its limit", "host"),
  cause(65, "over-ceiling", "measured current passed the ceiling", "host"),
  cause(66, "follow-high", "current ran above its aim", "host"),
  cause(67, "follow-low", "current ran below its aim", "host"),
  cause(68, "case-open", "the case sensor reads open", "host"),
  cause(69, "case-short", "the case sensor reads shorted", "host"),
  cause(70, "sensor-range", "a sensor reads outside its range", "host"),
  cause(71, "sample-gap", "samples stopped arriving", "host"),
  cause(72, "tick-drift", "the board's clock and this computer's disagree", "host"),
  cause(73, "controller-reset", "the board reset itself", "host"),
  cause(74, "key", "the key was seen off", "host"),
  cause(75, "loop", "the interlock loop was seen open", "host"),
  cause(76, "supply", "the supply left its window", "host"),
  cause(77, "output-lost", "output was lost while current flowed", "host"),
  cause(78, "dark-light", "light was seen while the bench was dark", "host"),
  cause(79, "dark-current", "current was seen while the bench was dark", "host"),
  cause(80, "curve-differs", "the board's curve is not the one this bench file makes", "host"),
  cause(81, "state-differs", "board and host disagree on the state", "host"),
  cause(82, "board-changed", "another board answered", "host"),
  cause(83, "link-lost", "the port was lost while armed", "host"),
  cause(84, "host-restarted", "the daemon had stopped while the bench was armed", "host"),
  cause(85, "daemon-stopped", "the daemon was stopped while the bench was armed", "host"),
  cause(
    86,
    "dark-time",
    "it stood armed at zero current longer than the bench file allows",
    "host",
  ),
  cause(87, "host-defect", "the daemon found itself in an impossible state", "host"),
  cause(88, "cut-at-open", "opening the port cuts it until a person lets it go", "host"),
  cause(89, "cut-by-person", "a person cut it, and the cut-off holds until it is let go", "host"),
  cause(255, "unknown", "no cause was kept", "board"),
];

const byCode = new Map(CAUSES.map((c) => [c.code, c]));
const byId = new Map(CAUSES.map((c) => [c.id, c]));
const UNKNOWN = CAUSES[CAUSES.length - 1] as Cause;

/** The cause of a code; an unlisted code reads as "unknown" (255). */
export const causeOf = (code: number): Cause => byCode.get(code) ?? UNKNOWN;
/** The cause of an identifier, or undefined where none is so named. */
export const causeById = (id: string): Cause | undefined => byId.get(id);
