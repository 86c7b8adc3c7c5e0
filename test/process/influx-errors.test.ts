import { once } from "node:events";
import { chmodSync, mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { createServer, type Server, type ServerResponse } from "node:http";
import { type AddressInfo, createServer as createTcp } from "node:net";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, beforeEach, describe, expect, onTestFinished, test } from "vitest";
import type { InfluxPart } from "../../daemon/model/bench.ts";
import { openForReading } from "../../daemon/record/folder.ts";
import {
  PASSWORD_VARIABLE,
  readCredentials,
  USER_VARIABLE,
} from "../../daemon/record/influx-credentials.ts";
import { newPlace } from "../../daemon/record/influx-place.ts";
import { lineOf, type Point, real, text, whole } from "../../daemon/record/influx-points.ts";
import { InfluxServer } from "../../daemon/record/influx-server.ts";
import { SecondHome } from "../../daemon/record/second-home.ts";
import { rowMaker } from "../unit/record/row-maker.ts";
import { recordRows, scratchFolder } from "../unit/record/synthetic.ts";

const folder = mkdtempSync(join(tmpdir(), "beamsitter-wire-"));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** A server that answers every write as a test says, and keeps the bodies. */
let answer: (response: ServerResponse, body: string) => void;
const bodies: string[] = [];
let server: Server;
let part: InfluxPart;
beforeEach(async () => {
  bodies.length = 0;
  answer = (response) => void response.writeHead(204).end();
  server = createServer((request, response) => {
    let body = "";
    request.on("data", (piece) => {
      body += piece;
    });
    request.on("end", () => {
      if (!request.url?.startsWith("/write")) response.end('{"results":[{}]}');
      else {
        bodies.push(body);
        answer(response, body);
      }
    });
  }).listen(0, "127.0.0.1");
  await once(server, "listening");
  const here = server;
  onTestFinished(() => {
    here.closeAllConnections();
    here.close();
  });
  const { port } = server.address() as AddressInfo;
  part = {
    url: `http://127.0.0.1:${port}`,
    database: "nights",
    server: "influxdb",
    keep_ms: null,
    caFile: null,
    credentialsFile: null,
    pages: "record",
  };
});

const POINT: Point = {
  measurement: "beamsitter_samples",
  tags: { bench: "north", session: "1" },
  fields: { current: whole(3), "judge.floor": real(0.5), words: text('he said "so"') },
  timestamp: "1780000000000000001",
};
const write = (): Promise<unknown> =>
  new InfluxServer(part, join(folder, "none"), 300).write([POINT, POINT]);

const says = (status: number, body: string) => (response: ServerResponse) =>
  void response.writeHead(status, { "content-type": "application/json" }).end(body);

describe("what a server answers, told in sentences", () => {
  test("the body is the lines that export writes", async () => {
    await write();
    expect(bodies).toEqual([`${lineOf(POINT)}\n${lineOf(POINT)}`]);
  });
  test("401: the user, and what to do", async () => {
    answer = says(401, '{"error":"authorization failed"}');
    await expect(write()).rejects.toMatchObject({
      kind: "later",
      message: `${part.url} does not let this user in (401). Put the right user and password into the environment or the credentials file; they are read again each time.`,
    });
  });
  test("404: the database", async () => {
    answer = says(404, '{"error":"database not found: \\"nights\\""}');
    await expect(write()).rejects.toMatchObject({
      kind: "later",
      message: `${part.url} has no database "nights", or not its retention policy (404: database not found: "nights"). Create it there, or give this user the right to; it is asked again.`,
    });
  });
  test("413: too much at once", async () => {
    answer = says(413, '{"error":"Request Entity Too Large"}');
    await expect(write()).rejects.toMatchObject({ kind: "split" });
  });
  test("400: refused, with the server's words", async () => {
    answer = says(400, '{"error":"unable to parse: bad"}');
    await expect(write()).rejects.toMatchObject({
      kind: "refused",
      message: `${part.url} refuses a point: unable to parse: bad.`,
    });
  });
  test("400 for a part of it: the rest is taken, the part counted", async () => {
    const words = "partial write: points beyond retention policy dropped=2";
    answer = says(400, JSON.stringify({ error: words }));
    await expect(write()).resolves.toEqual({ dropped: 2, words });
  });
  test("503", async () => {
    answer = says(503, "overloaded");
    await expect(write()).rejects.toMatchObject({
      kind: "later",
      message: `${part.url} cannot serve now (Service Unavailable). It is asked again; the record keeps what is to be sent.`,
    });
  });
  test("half a body: it ends by itself, and is asked again", async () => {
    answer = (response) => {
      response.writeHead(200, { "content-length": 100 });
      response.write('{"results":[{"ser');
    };
    await expect(write()).rejects.toMatchObject({
      kind: "later",
      message: `${part.url} began an answer and did not end it within 0.3 s. It is asked again.`,
    });
  });
  test("half a body, and then the line is gone", async () => {
    answer = (response) => {
      response.writeHead(200, { "content-length": 100 });
      response.write("{");
      setImmediate(() => response.socket?.destroy());
    };
    await expect(write()).rejects.toMatchObject({ kind: "later" });
  });
  test("nothing at all", async () => {
    answer = () => undefined;
    await expect(write()).rejects.toMatchObject({ kind: "later" });
  });
  test("something that does not speak HTTP", async () => {
    const other = createTcp((socket) => socket.end("220 mail here\r\n")).listen(0, "127.0.0.1");
    onTestFinished(() => void other.close());
    await once(other, "listening");
    part = { ...part, url: `http://127.0.0.1:${(other.address() as AddressInfo).port}` };
    await expect(write()).rejects.toThrow(/does not answer \(HPE_INVALID_CONSTANT\)/);
  });
  test("nobody there", async () => {
    server.close();
    await once(server, "close");
    await expect(write()).rejects.toThrow(/does not answer \(ECONNREFUSED\)/);
  });
});

describe("a body that is too large", () => {
  test("is sent in smaller ones until all of it is there", async () => {
    const scratch = scratchFolder();
    onTestFinished(scratch.remove);
    recordRows(
      scratch.folder,
      rowMaker(1, (i) => i * 50),
      1000,
    );
    const lines = new Set<string>();
    answer = (response, body) => {
      if (body.length > 30_000) return says(413, '{"error":"too large"}')(response);
      for (const line of body.split("\n")) lines.add(line);
      return says(204, "")(response);
    };
    const db = openForReading(scratch.folder);
    const keeper = { load: () => newPlace("fake"), save: () => undefined };
    const there = new InfluxServer(part, join(folder, "none"));
    const home = new SecondHome((work) => work(db), there, keeper, "fake");
    while (await home.step());
    expect(home.place).toMatchObject({ samples: 1000, dropped: 0 });
    expect([...lines].filter((line) => line.startsWith("beamsitter_samples"))).toHaveLength(1000);
    db.close();
  });
});

describe("credentials", () => {
  const file = join(folder, "credentials");
  test("come from the environment first, then from a file that only its owner reads", () => {
    writeFileSync(file, "writer\nsecret\n", { mode: 0o600 });
    chmodSync(file, 0o600);
    expect(readCredentials(file, {})).toEqual({ user: "writer", password: "secret" });
    const environment = { [USER_VARIABLE]: "other", [PASSWORD_VARIABLE]: "word" };
    expect(readCredentials(file, environment)).toEqual({ user: "other", password: "word" });
    expect(readCredentials(join(folder, "none"), {})).toBeNull();
  });
  test("in a file that others can read, or without a password, are refused in words", () => {
    chmodSync(file, 0o644);
    expect(() => readCredentials(file, {})).toThrow(
      `${file} has mode 644, so others can read the password; wanted 600. Run: chmod 600 ${file}.`,
    );
    chmodSync(file, 0o600);
    writeFileSync(file, "writer\n");
    expect(() => readCredentials(file, {})).toThrow("a user on its first line and a password");
  });
});
