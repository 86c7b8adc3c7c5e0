/**
 * A second judge of lines, written from PROTOCOL.md without a line of the codec: checksum bit by
 * bit, grammar by patterns. Slow and plain. What both say alike is not one mistake made once.
 */

const crcBitwise = (text: string): string => {
  let crc = 0xffff;
  for (const character of text) {
    for (let bit = 7; bit >= 0; bit -= 1) {
      const top = (crc >> 15) & 1;
      crc = (crc << 1) & 0xffff;
      if (top !== ((character.charCodeAt(0) >> bit) & 1)) crc ^= 0x1021;
    }
  }
  return crc.toString(16).toUpperCase().padStart(4, "0");
};

const U8 = "(?:25[0-5]|2[0-4]\\d|1\\d\\d|[1-9]\\d|\\d)";
const HOST_CAUSE = "(?:0|6[4-9]|[7-9]\\d|1\\d\\d|2[0-4]\\d|25[0-4])";
const U16 = "(?:6553[0-5]|655[0-2]\\d|65[0-4]\\d\\d|6[0-4]\\d{3}|[1-5]\\d{4}|[1-9]\\d{0,3}|0)";
const U32 =
  "(?:429496729[0-5]|42949672[0-8]\\d|4294967[01]\\d\\d|429496[0-6]\\d{3}|42949[0-5]\\d{4}|4294[0-8]\\d{5}|429[0-3]\\d{6}|42[0-8]\\d{7}|4[01]\\d{8}|[1-3]\\d{9}|[1-9]\\d{0,8}|0)";
const I31 =
  "(?:214748364[0-7]|21474836[0-3]\\d|2147483[0-5]\\d\\d|214748[0-2]\\d{3}|21474[0-7]\\d{4}|2147[0-3]\\d{5}|214[0-6]\\d{6}|21[0-3]\\d{7}|20\\d{8}|1\\d{9}|[1-9]\\d{0,8})";
const I32 = `(?:0|-?${I31}|-2147483648)`;
const H32 = "[0-9A-F]{8}";
const word = (n: number): string => `[a-z][a-z0-9.-]{0,${n - 1}}`;
const COUNT_64 = "(?:6[0-4]|[1-5]\\d|[1-9])";
const GROUP = "(?:1[0-5]|\\d)";
const ANY = "[!-~]+";

const GRAMMAR: Readonly<Record<string, string>> = {
  ">who": U8,
  ">ask": "(?:arm|inject)",
  ">arm": H32,
  ">permit": `${H32} ${U32} ${U16} ${U16} ${U16}(?: ${U16}/${U16})?`,
  ">dark": HOST_CAUSE,
  ">reset": U8,
  ">stage": U8,
  ">point": `${U8} ${U16} ${U16}`,
  ">commit": H32,
  ">readback": U8,
  ">inject": `${word(12)} ${H32}`,
  ">cool": `${H32} ${U16}`,
  ">shutter": `(?:open ${H32}|close)`,
  ">status": "",
  "<boot": `${word(20)} (?:power|brown-out|watchdog|external|unknown)`,
  "<hello": `(?:1 ${word(20)} [A-Z0-9-]{1,12} ${U32} (?:10000|[1-9]\\d{2,3}) ${U16} ${H32} ${U16} ${U16} ${U16} ${U16} (?=[^ ]{1,40} )(?:-|${word(40)}(?:,${word(40)})*) ${COUNT_64}|(?!1 )${U8}(?: ${ANY})*)`,
  "<channel": `${U8} ${word(12)} [a-zA-Z%/]{1,8} ${U16}e(?:[0-6]|-[1-9]|-1[0-2]) ${I32} ${I32} ${GROUP}`,
  "<end": `${COUNT_64} ${H32}`,
  "<sample": `${U32} ${U32} [0-9A-F]{4} ${U8} (?:-|${U32}) (?:-|${U16}) ${U16} ${GROUP}(?: ${I32}){0,64}`,
  "<offer": `(?:arm|inject) ${H32} ${U32} ${U32}`,
  "<yes": `(?:arm ${H32}|dark ${HOST_CAUSE}|reset ${U8}|stage ${U8}|point ${U8}|commit ${H32}|inject ${word(12)}|cool ${U16}|shutter (?:open|close))`,
  "<no": `(?:permit ${word(12)}(?: ${U32})?|who ${word(12)}(?: ${U8})?|(?:ask|arm|dark|reset|stage|point|commit|readback|inject|cool|shutter|status) ${word(12)}(?: ${ANY})*)`,
  "<curve": `${U8} ${U16} ${U16} ${U8} ${H32}`,
  "<counts": `${U32}(?: ${U32}){8}`,
  "<say": `${ANY}(?: ${ANY})*`,
};

const structure = (line: string, own: ">" | "<"): string => {
  if (line === "") return "empty";
  if (line.length > 160) return "long";
  if (!/^[ -~]*$/.test(line)) return "char";
  if (line[0] !== own) return "direction";
  const tail = /^(.+) ([0-9A-F]{4})$/.exec(line);
  if (tail === null || crcBitwise(tail[1] ?? "") !== tail[2]) return "crc";
  const body = tail[1] ?? "";
  const space = body.indexOf(" ");
  const key = space < 0 ? body : body.slice(0, space);
  const grammar = Object.entries(GRAMMAR).find(([verb]) => verb === key)?.[1];
  if (grammar === undefined) return "verb";
  const pattern = grammar === "" ? /^$/ : new RegExp(`^ ${grammar}$`);
  return pattern.test(body.slice(key.length)) ? "ok" : "form";
};

/** The verdict on a line, in the words of the vectors. */
export const secondJudge = (line: string, to: "controller" | "host"): string => {
  const verdict = structure(line, to === "controller" ? ">" : "<");
  if (to === "host" || (verdict === "ok" && line.startsWith(">dark "))) return verdict;
  const lower = line.toLowerCase();
  if (lower.startsWith("dark") || lower.startsWith(">dark")) return "dark";
  return line.includes("\u0018".repeat(3)) ? "dark" : verdict;
};
