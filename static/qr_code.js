// A QR code of a text: bytes, level L, the smallest version that holds them, the mask that is easiest to read.
import { VERSIONS, fixedPatterns, interleaved, roomForData, writeFormat } from "./qr_parts.js";

const MASKS = [
  (row, column) => (row + column) % 2,
  (row) => row % 2,
  (row, column) => column % 3,
  (row, column) => (row + column) % 3,
  (row, column) => (Math.floor(row / 2) + Math.floor(column / 3)) % 2,
  (row, column) => ((row * column) % 2) + ((row * column) % 3),
  (row, column) => (((row * column) % 2) + ((row * column) % 3)) % 2,
  (row, column) => (((row + column) % 2) + ((row * column) % 3)) % 2,
];
const QUIET = 4;
const bitsOf = (value, count) => Array.from({ length: count }, (_, at) => (value >> (count - 1 - at)) & 1);
const lengthBits = (version) => (version < 10 ? 8 : 16);

function smallest(length) {
  for (let version = 1; version <= VERSIONS; version += 1) {
    const cells = fixedPatterns(version);
    const total = Math.floor(cells.flat().filter((cell) => cell === undefined).length / 8);
    const room = roomForData(version, total);
    if (4 + lengthBits(version) + 8 * length <= 8 * room) return { version, cells, room };
  }
  throw new RangeError("too long for a QR code");
}

function wordsOf(bytes, version, room) {
  const bits = [...bitsOf(0b0100, 4), ...bitsOf(bytes.length, lengthBits(version)), ...[...bytes].flatMap((byte) => bitsOf(byte, 8))];
  bits.push(...new Array(Math.min(4, 8 * room - bits.length)).fill(0));
  while (bits.length % 8) bits.push(0);
  const words = [];
  for (let at = 0; at < bits.length; at += 8) words.push(parseInt(bits.slice(at, at + 8).join(""), 2));
  for (let filler = 0xec; words.length < room; filler ^= 0xec ^ 0x11) words.push(filler);
  return words;
}

// The places for data: two columns at a time from the right, up and down in turn, past the column of the time pattern.
function places(cells) {
  const found = [];
  for (let right = cells.length - 1, up = true; right > 0; right -= 2, up = !up) {
    if (right === 6) right -= 1;
    for (let step = 0; step < cells.length; step += 1) {
      const row = up ? cells.length - 1 - step : step;
      for (const column of [right, right - 1]) if (cells[row][column] === undefined) found.push([row, column]);
    }
  }
  return found;
}

// Long runs, blocks, what looks like a corner, and too much of one colour make a code hard to read.
function penalty(cells) {
  const columns = cells.map((_, at) => cells.map((row) => row[at]));
  let sum = 0;
  for (const line of [...cells, ...columns].map((one) => one.join(""))) {
    for (const [run] of line.matchAll(/0{5,}|1{5,}/g)) sum += run.length - 2;
    sum += 40 * [...line.matchAll(/(?=10111010000|00001011101)/g)].length;
  }
  for (let row = 1; row < cells.length; row += 1) {
    for (let column = 1; column < cells.length; column += 1) {
      const dark = cells[row][column] + cells[row - 1][column] + cells[row][column - 1] + cells[row - 1][column - 1];
      if (dark % 4 === 0) sum += 3;
    }
  }
  const all = cells.flat();
  const share = all.filter(Boolean).length / all.length;
  return sum + 10 * Math.floor(Math.abs(share * 100 - 50) / 5);
}

// The rows of the code, 1 for dark, and the number of its mask.
export function qrMatrix(text) {
  const bytes = new TextEncoder().encode(text);
  const { version, cells, room } = smallest(bytes.length);
  const bits = interleaved(wordsOf(bytes, version, room), version).flatMap((word) => bitsOf(word, 8));
  const free = places(cells);
  const candidates = MASKS.map((rule, mask) => {
    const rows = cells.map((row) => [...row]);
    free.forEach(([row, column], at) => { rows[row][column] = (bits[at] ?? 0) ^ (rule(row, column) === 0 ? 1 : 0); });
    writeFormat(rows, mask);
    return { rows, mask, penalty: penalty(rows) };
  });
  return candidates.reduce((best, one) => (one.penalty < best.penalty ? one : best));
}

// Dark on white in every look: a camera does not know of dark pages.
export function qrPicture(text, name) {
  const { rows } = qrMatrix(text);
  const side = rows.length + 2 * QUIET;
  const drawn = rows.flatMap((row, y) => [...row.join("").matchAll(/1+/g)]
    .map((run) => `M${run.index + QUIET} ${y + QUIET}h${run[0].length}v1h-${run[0].length}z`)).join("");
  const make = (tag, attributes) => {
    const one = document.createElementNS("http://www.w3.org/2000/svg", tag);
    for (const [key, value] of Object.entries(attributes)) one.setAttribute(key, value);
    return one;
  };
  const viewBox = `0 0 ${side} ${side}`;
  const picture = make("svg", { class: "qr whole", role: "img", "aria-label": name, viewBox, "shape-rendering": "crispEdges" });
  picture.append(make("rect", { width: side, height: side, fill: "#fff" }), make("path", { d: drawn, fill: "#000" }));
  return picture;
}
