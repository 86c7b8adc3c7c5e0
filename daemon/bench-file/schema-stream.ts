import { z } from "zod";
import { STREAM_FORMATS } from "../model/stream.ts";
import { line, oneOf, plainNumber, quantity, section } from "./fields.ts";

/** How the lines of a controller with firmware of its own are read, as the file writes it. */
const factor = { min: -1e9, max: 1e9 };

const columnSchema = section("a map of from and unit", {
  from: line("the key, label or place (from 1) of the number in a line", /^[^\r\n]{1,60}$/),
  unit: line("the printed unit, such as A or °C, or counts", /^\S{1,12}$/),
  scale: plainNumber("what the printed number is multiplied by", factor, 1),
  offset: plainNumber("what is added after that, in the printed unit", factor, 0),
  shunt: quantity("resistance", { min: 1e-6, max: 1e6 }).optional(),
  feedback: quantity("resistance", { min: 1, max: 1e12 }).optional(),
  responsivity: plainNumber("the photodiode's responsivity in A/W", {
    min: 1e-6,
    max: 10,
  }).optional(),
  step: plainNumber("the printed value that one recorded count stands for", {
    min: 1e-9,
    max: 1e6,
  }).optional(),
  error: line("half the width of the stated error, in the printed unit", /^\d+(\.\d+)?$/, "0"),
});

const name = /^[a-z][a-z0-9-]{0,30}$/;

export const streamSchema = section("a map that says how a line is read", {
  format: oneOf("how a line carries its numbers", STREAM_FORMATS),
  separator: oneOf(
    "what parts the columns of a csv line",
    ["comma", "semicolon", "tab", "space", "bar"],
    "comma",
  ),
  decimals: oneOf("how decimals are written", ["point", "comma"], "point"),
  time: line("key or place of the controller's own time, or none", /^[^\r\n]{1,60}$/, "none"),
  "time-unit": oneOf("the unit of that time", ["ms", "s", "us"], "ms"),
  banner: line("text by which a restart is known", /^[^\r\n]{0,60}$/, ""),
  columns: z.record(z.string().regex(name), columnSchema, {
    error: () => "a map of channels, each with from and unit",
  }),
});

export const cutOffSchema = section("a map that says how light is cut", {
  kind: oneOf("what cuts the light", ["rts", "dtr", "text"]),
  mode: oneOf("how a line cuts", ["static", "toggled"], "static"),
  "asserted-means": oneOf("what the line does while asserted", ["cut", "light"], "cut"),
  send: line("the text that cuts", /^[\x20-\x7e]{1,100}$/, ""),
  expect: line("text in the controller's answer", /^[\x20-\x7e]{1,100}$/, ""),
  within: quantity("time", { min: 20, max: 10_000 }, 500),
});
