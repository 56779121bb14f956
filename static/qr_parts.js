// The parts of a QR code, after ISO/IEC 18004: the blocks of level L, their check words, and the patterns that are fixed.

// By version, 1 to 40: check words in each block, and blocks.
const CHECKS = [7, 10, 15, 20, 26, 18, 20, 24, 30, 18, 20, 24, 26, 30, 22, 24, 28, 30, 28, 28,
  28, 28, 30, 30, 26, 28, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30];
const BLOCKS = [1, 1, 1, 1, 1, 2, 2, 2, 2, 4, 4, 4, 4, 4, 6, 6, 6, 6, 7, 8,
  8, 9, 9, 10, 12, 12, 12, 13, 14, 15, 16, 17, 18, 19, 19, 20, 21, 22, 24, 25];
export const VERSIONS = CHECKS.length;

// Numbers of GF(256) as powers of 2 modulo x^8 + x^4 + x^3 + x^2 + 1, and back.
const POWERS = [1];
while (POWERS.length < 255) POWERS.push((POWERS.at(-1) << 1) ^ (POWERS.at(-1) > 127 ? 0x11d : 0));
const LOGS = new Map(POWERS.map((value, power) => [value, power]));
const times = (one, other) => (one && other ? POWERS[(LOGS.get(one) + LOGS.get(other)) % 255] : 0);

// The product of (x - 2^i), without its leading 1, highest power first.
function generator(degree) {
  let terms = [1];
  for (const root of POWERS.slice(0, degree)) {
    terms = [...terms, 0].map((term, place) => term ^ (place ? times(terms[place - 1], root) : 0));
  }
  return terms.slice(1);
}

// What is left of the words, as a polynomial, after division by the generator.
function checkWords(words, divisor) {
  const left = divisor.map(() => 0);
  for (const word of words) {
    const factor = word ^ left.shift();
    left.push(0);
    divisor.forEach((term, place) => { left[place] ^= times(term, factor); });
  }
  return left;
}

export const roomForData = (version, total) => total - CHECKS[version - 1] * BLOCKS[version - 1];

// The words in their blocks, shorter blocks first, each with its check words; then the first of each, the second of each…
export function interleaved(words, version) {
  const [count, divisor] = [BLOCKS[version - 1], generator(CHECKS[version - 1])];
  const short = Math.floor(words.length / count);
  const blocks = [];
  for (let from = 0; blocks.length < count;) {
    const to = from + short + (blocks.length >= count - (words.length % count) ? 1 : 0);
    blocks.push(words.slice(from, to));
    from = to;
  }
  const inTurn = (lists) => Array.from({ length: Math.max(...lists.map((one) => one.length)) },
    (_, at) => lists.filter((one) => at < one.length).map((one) => one[at])).flat();
  return [...inTurn(blocks), ...inTurn(blocks.map((one) => checkWords(one, divisor)))];
}

// A number followed by what protects it: the remainder of its division by a polynomial.
function guarded(value, polynomial, extra) {
  let left = value << extra;
  for (let bit = 31 - Math.clz32(left); bit >= extra; bit -= 1) if ((left >> bit) & 1) left ^= polynomial << (bit - extra);
  return (value << extra) | left;
}

function alignments(version, size) {
  if (version === 1) return [];
  const steps = Math.floor(version / 7) + 1;
  const step = version === 32 ? 26 : Math.ceil((size - 13) / steps / 2) * 2;
  return [6, ...Array.from({ length: steps }, (_, at) => size - 7 - step * (steps - 1 - at))];
}

// Which mask was used, and level L (01), twice.
export function writeFormat(cells, mask) {
  const [size, word] = [cells.length, guarded(0b01000 | mask, 0x537, 10) ^ 0x5412];
  for (let at = 0; at < 15; at += 1) {
    const bit = (word >> at) & 1;
    if (at < 8) cells[at < 6 ? at : at + 1][8] = cells[8][size - 1 - at] = bit;
    else cells[8][at === 8 ? 7 : 14 - at] = cells[size - 15 + at][8] = bit;
  }
}

// The rows of a code: 1 is dark, 0 light, undefined is room for data.
export function fixedPatterns(version) {
  const size = 17 + 4 * version;
  const cells = Array.from({ length: size }, () => new Array(size).fill(undefined));
  const rings = (row, column, radius, light) => {
    for (let y = Math.max(0, row - radius); y <= Math.min(size - 1, row + radius); y += 1) {
      for (let x = Math.max(0, column - radius); x <= Math.min(size - 1, column + radius); x += 1) {
        cells[y][x] = light.includes(Math.max(Math.abs(y - row), Math.abs(x - column))) ? 0 : 1;
      }
    }
  };
  for (const [row, column] of [[3, 3], [3, size - 4], [size - 4, 3]]) rings(row, column, 4, [2, 4]);
  const centres = alignments(version, size).flatMap((row, _, all) => all.map((column) => [row, column]));
  for (const [row, column] of centres) if (cells[row][column] === undefined) rings(row, column, 2, [1]);
  for (let at = 8; at < size - 8; at += 1) cells[6][at] = cells[at][6] = 1 - (at % 2);
  writeFormat(cells, 0);
  cells[size - 8][8] = 1;
  const word = version < 7 ? 0 : guarded(version, 0x1f25, 12);
  for (let at = 0; word && at < 18; at += 1) {
    const [long, across] = [Math.floor(at / 3), size - 11 + (at % 3)];
    cells[long][across] = cells[across][long] = (word >> at) & 1;
  }
  return cells;
}
