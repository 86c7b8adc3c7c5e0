import type { Bench, ProtectionsPart } from "../../model/bench.ts";
import type { Finding } from "../problem.ts";
import type { LintCode } from "./catalogue.ts";
import { warning } from "./finding.ts";

interface Expected {
  readonly part: keyof ProtectionsPart;
  readonly key: string;
  readonly code: LintCode;
  readonly why: string;
}

/** What published laser-product practice (IEC 60825-1) expects of the higher classes, and the enable. */
const EXPECTED: readonly Expected[] = [
  {
    part: "key",
    key: "key",
    code: "no-key",
    why: "a key, so that nobody lights the laser in passing",
  },
  {
    part: "interlockLoop",
    key: "interlock-loop",
    code: "no-interlock-loop",
    why: "an interlock connector, so that a door or enclosure cuts light in hardware",
  },
  {
    part: "emissionWarning",
    key: "emission-warning",
    code: "no-emission-warning",
    why: "a warning of emission that can be seen through the eye protection",
  },
  {
    part: "beamStop",
    key: "beam-stop",
    code: "no-beam-stop",
    why: "a beam stop, so that light can end without the diode",
  },
  {
    part: "manualReset",
    key: "manual-reset",
    code: "no-manual-reset",
    why: "a manual reset, so that a closing door never brings light back",
  },
  {
    part: "toggledEnable",
    key: "toggled-enable",
    code: "no-toggled-enable",
    why: "an enable made from a toggled pin, so that a hung controller goes dark in about 100 ms",
  },
];

/** Hints, never errors: the bench's owner and the laser safety officer decide. */
export function lintProtections({ protections }: Bench): Finding[] {
  return EXPECTED.filter(({ part }) => !protections[part]).map(({ key, code, why }) =>
    warning(code, ["protections", key], {
      found: `no ${key}`,
      wanted: why,
      do: `add it to the bench and write ${key}: yes; the program cannot stand in for it`,
    }),
  );
}
