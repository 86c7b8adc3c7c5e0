import { readFileSync } from "node:fs";
import { join } from "node:path";
import { describe, expect, test } from "vitest";
import { packageRoot } from "../../daemon/paths.ts";
import { crc16, crc16Text, crc32, crc32Text, hex16, hex32 } from "../../firmware-protocol/crc.ts";

/** Source: catalogue of parametrised CRC algorithms; the data file says how it was obtained. */
interface CrcData {
  readonly catalogue: readonly { readonly name: string; readonly check_of_123456789: string }[];
  readonly strings: readonly Readonly<Record<string, string | number | null>>[];
}

const data: CrcData = JSON.parse(
  readFileSync(join(packageRoot, "test", "published", "data", "crc.json"), "utf8"),
);
const checkOf = (name: string): number =>
  Number(data.catalogue.find((row) => row.name === name)?.check_of_123456789);

describe("checksums against the catalogue of parametrised CRC algorithms", () => {
  test("CRC-16/IBM-3740 of 123456789 is 29B1", () => {
    expect(hex16(crc16Text("123456789"))).toBe("29B1");
    expect(crc16Text("123456789")).toBe(checkOf("CRC-16/IBM-3740"));
  });

  test("CRC-32/ISO-HDLC of 123456789 is CBF43926", () => {
    expect(hex32(crc32Text("123456789"))).toBe("CBF43926");
    expect(crc32Text("123456789")).toBe(checkOf("CRC-32/ISO-HDLC"));
  });

  test("all twenty strings of the data file, as bytes and as text", () => {
    expect(data.strings).toHaveLength(20);
    for (const row of data.strings) {
      const bytes = Buffer.from(String(row.hex), "hex");
      const text = bytes.toString("latin1");
      const want16 = Number(row["CRC-16/IBM-3740"]);
      const want32 = Number(row["CRC-32/ISO-HDLC"]);
      expect([crc16(bytes), crc16Text(text)]).toEqual([want16, want16]);
      expect([crc32(bytes), crc32Text(text)]).toEqual([want32, want32]);
    }
  });

  test("a message followed by its own CRC-16, high byte first, leaves zero", () => {
    const crc = crc16Text("123456789");
    expect(crc16Text(`123456789${String.fromCharCode(crc >> 8, crc & 255)}`)).toBe(0);
  });
});
