import type { Channel, Manifest } from "../daemon/model/manifest.ts";
import { crc32Text, hex32 } from "./crc.ts";
import { bodyOf, LINE_BYTES_MAX } from "./line.ts";
import { type FieldsOf, readLine } from "./messages.ts";

/** Channels that a judge cannot do without; all of them stand in group 0. */
const REQUIRED_CHANNELS = ["set", "current", "case", "photodiode"] as const;

/** A manifest, or everything that is wrong with the introduction. */
export type ManifestResult =
  | { readonly kind: "manifest"; readonly manifest: Manifest }
  | { readonly kind: "problems"; readonly problems: readonly string[] };

type Hello = Extract<FieldsOf<"hello">, { firmware: string }>;

/** Longest text of a count between two bounds, with the space before it. */
const countBytes = (c: Channel): number =>
  1 + Math.max(String(c.count_min).length, String(c.count_max).length);

/** "<sample" with every header field at its longest, and the checksum. */
const SAMPLE_HEADER_BYTES =
  "<sample 4294967295 4294967295 FFFF 255 4294967295 65535 65535 15".length + 5;

const channelProblems = (channels: readonly Channel[]): string[] => {
  const problems: string[] = [];
  const seen = new Set<string>();
  channels.forEach((channel, place) => {
    const at = `channel ${channel.index} (${channel.name})`;
    if (channel.index !== place)
      problems.push(`${at} came at place ${place}; indexes ascend from 0`);
    if (seen.has(channel.name)) problems.push(`${at} has a name that an earlier channel has`);
    seen.add(channel.name);
    if (channel.count_min >= channel.count_max) {
      problems.push(
        `${at} has a smallest count ${channel.count_min} not below its largest ${channel.count_max}`,
      );
    }
    if (channel.perCount === 0) problems.push(`${at} has a scale of zero`);
  });
  for (const name of REQUIRED_CHANNELS) {
    const channel = channels.find((c) => c.name === name);
    if (channel === undefined) problems.push(`channel ${name} is missing; a judge needs it`);
    else if (channel.group !== 0) {
      problems.push(
        `channel ${name} is in group ${channel.group}; it must be in group 0, in every sample`,
      );
    }
  }
  return problems;
};

const sizeProblems = (channels: readonly Channel[]): string[] => {
  const bytesOf = (group: number): number =>
    channels.filter((c) => c.group === group).reduce((sum, c) => sum + countBytes(c), 0);
  const zero = SAMPLE_HEADER_BYTES + bytesOf(0);
  const groups = [...new Set(channels.map((c) => c.group))];
  return groups.flatMap((group) => {
    const bytes = group === 0 ? zero : zero + bytesOf(group);
    if (bytes <= LINE_BYTES_MAX) return [];
    return [`a sample of group ${group} can take ${bytes} bytes; a line holds ${LINE_BYTES_MAX}`];
  });
};

const helloProblems = (hello: Hello): string[] => {
  const problems: string[] = [];
  if (hello.termMin > hello.termMax) {
    problems.push(
      `the shortest term, ${hello.termMin} ticks, is above the longest, ${hello.termMax}`,
    );
  }
  if (hello.termMin === 0) problems.push("the shortest term is zero ticks");
  if (hello.rate === 0) problems.push("the board offers no samples: its rate is 0");
  if (hello.absolute === 0)
    problems.push("the board's own ceiling is 0 counts: it can give no light");
  return problems;
};

/**
 * Gathers an introduction line by line. A new `hello` starts over, so that a torn first try does
 * no harm.
 */
export class ManifestReader {
  private hello: Hello | null = null;
  private channels: Channel[] = [];
  private text = "";

  /** Forgets what was gathered. */
  clear(): void {
    this.hello = null;
    this.channels = [];
    this.text = "";
  }

  begin(hello: Hello): void {
    this.clear();
    this.hello = hello;
  }

  /** @param line the whole channel line, with its checksum, as it came */
  channel(fields: FieldsOf<"channel">, line: string): void {
    if (this.hello === null || this.channels.length > this.hello.channels) return;
    this.text += `${bodyOf(line)}\n`;
    this.channels.push({
      index: fields.index,
      name: fields.name,
      unit: fields.unit,
      perCount: fields.perCount,
      count_min: fields.min,
      count_max: fields.max,
      group: fields.group,
    });
  }

  /** Closes the introduction: the manifest, or all that is wrong with it. */
  end(fields: FieldsOf<"end">): ManifestResult {
    const { hello, channels } = this;
    const id = hex32(crc32Text(this.text));
    this.clear();
    if (hello === null)
      return { kind: "problems", problems: ["the introduction had no hello line"] };
    const problems = helloProblems(hello);
    if (fields.channels !== hello.channels) {
      problems.push(`hello told ${hello.channels} channels, end told ${fields.channels}`);
    }
    if (channels.length !== hello.channels) {
      problems.push(`${hello.channels} channels were told, ${channels.length} came`);
    } else if (id !== fields.manifest) {
      problems.push(`the channel lines sum to ${id}, the end line says ${fields.manifest}`);
    }
    problems.push(...channelProblems(channels), ...sizeProblems(channels));
    if (problems.length > 0) return { kind: "problems", problems };
    return { kind: "manifest", manifest: manifestOf(hello, channels, id) };
  }
}

const manifestOf = (hello: Hello, channels: readonly Channel[], id: string): Manifest => ({
  id,
  protocol: hello.proto,
  firmware: hello.firmware,
  serial: hello.serial,
  boot: hello.boot,
  tick_us: hello.tick_us,
  absolute_counts: hello.absolute,
  curveCrc: hello.curve,
  term_ticks_min: hello.termMin,
  term_ticks_max: hello.termMax,
  fall_ms: hello.fall_ms,
  rate_perS: hello.rate,
  capabilities: hello.caps,
  channels,
});

/** A whole introduction from its lines (without their ends): manifest, or all problems named. */
export const readManifest = (lines: readonly string[]): ManifestResult => {
  const reader = new ManifestReader();
  const problems: string[] = [];
  for (const line of lines) {
    const message = readLine(line, "host");
    if (message.kind !== "message") {
      problems.push(
        `line "${line}" is broken (${message.kind === "broken" ? message.broken : "dark"})`,
      );
    } else if (message.verb === "hello") {
      if (message.fields.firmware === null) {
        problems.push(
          `the board speaks version ${message.fields.proto}; this host speaks version 1`,
        );
      } else reader.begin(message.fields);
    } else if (message.verb === "channel") reader.channel(message.fields, line);
    else if (message.verb === "end") {
      const result = reader.end(message.fields);
      if (result.kind === "manifest" && problems.length === 0) return result;
      return {
        kind: "problems",
        problems: [...problems, ...(result.kind === "problems" ? result.problems : [])],
      };
    }
  }
  return { kind: "problems", problems: [...problems, "the introduction has no end line"] };
};
