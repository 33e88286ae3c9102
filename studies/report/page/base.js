// Data of the page and small helpers. All parts of the program share one function scope.
"use strict";
const data = JSON.parse(document.getElementById("report-data").textContent);
const element = (id) => document.getElementById(id);
const bytes = (text) => Uint8Array.from(atob(text), (letter) => letter.charCodeAt(0));
const coarse = (part) =>
  part.count
    ? new Float64Array(part.count).fill(part.low)
    : Float64Array.from(new Uint16Array(bytes(part.codes).buffer), (code) =>
      code === 65535 ? NaN : part.low + code * part.step);

const columns = data.columns;
const families = data.families;
const ids = data.designs.ids;
const count = ids.length;
const familyOf = data.designs.family;
const everything = new Float32Array(bytes(data.designs.values).buffer);
const values = columns.map((_, i) => everything.subarray(i * count, (i + 1) * count));
const rowOf = new Map(ids.map((id, i) => [id, i]));

const state = {
  x: data.start.x,
  y: data.start.y,
  colour: data.start.colour,
  families: new Set(families.map((_, i) => i)),
  bounds: [],
  axes: data.start.axes.slice(),
  selected: [],
  passing: [],
};
let place = 0; // which of the selected designs the card shows

function text(value) {
  if (!Number.isFinite(value)) return "–";
  const size = Math.abs(value);
  if (size >= 1e6 || (size > 0 && size < 1e-4)) return value.toExponential(3);
  return String(Number(value.toPrecision(4)));
}

function percent(share) {
  return `${Number((100 * share).toPrecision(3))} %`;
}

function named(column) {
  return column.unit ? `${column.title}, ${column.unit}` : column.title;
}

function make(tag, content, attributes) {
  const made = document.createElement(tag);
  for (const item of [content ?? []].flat()) made.append(item);
  for (const [key, value] of Object.entries(attributes ?? {})) made.setAttribute(key, value);
  return made;
}

function range(list) {
  let low = Infinity;
  let high = -Infinity;
  for (const value of list) {
    if (value < low) low = value;
    if (value > high) high = value;
  }
  return [low, high];
}

// At most one run of `work` in each frame, however often it is asked for.
function once(work) {
  let waiting = false;
  return () => {
    if (waiting) return;
    waiting = true;
    requestAnimationFrame(() => {
      waiting = false;
      work();
    });
  };
}

async function unpack(id) {
  const packed = bytes(JSON.parse(element(id).textContent));
  const stream = new Blob([packed]).stream().pipeThrough(new DecompressionStream("gzip"));
  return JSON.parse(await new Response(stream).text());
}
