// Numbers: unpacked to the bit, and written out with all their digits.

/** The bytes of a packed block that stands in the page. */
const unpacked = async (text) => {
  const bytes = Uint8Array.from(atob(text.trim()), (letter) => letter.charCodeAt(0));
  const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate"));
  return new Uint8Array(await new Response(stream).arrayBuffer());
};

/** The columns of a block: byte planes, folded differences, then sums (numbers.rs writes them). */
const columnsOf = (bytes, columns) => {
  let begin = 0;
  return columns.map(([n, times]) => {
    const whole = new BigUint64Array(n);
    const raw = new Uint8Array(whole.buffer);
    for (let byte = 0; byte < 8; byte += 1) {
      for (let i = 0; i < n; i += 1) raw[8 * i + byte] = bytes[begin + byte * n + i];
    }
    begin += 8 * n;
    if (times > 0) {
      for (let i = 0; i < n; i += 1) whole[i] = (whole[i] >> 1n) ^ -(whole[i] & 1n);
    }
    for (let time = 0; time < times; time += 1) {
      for (let i = 1; i < n; i += 1) whole[i] += whole[i - 1];
    }
    return new Float64Array(whole.buffer);
  });
};

/**
 * Where two shortest decimals lie equally near to a number, the browser takes the even one and the archive's export the
 * greater: this gives the greater one's digits, as `toExponential` would write them; otherwise the text as it is.
 * Such numbers have few binary places, so that their multiple of 2^40 is whole.
 */
const greaterOfTwo = (size, text) => {
  const [mantissa, power] = text.split("e");
  const figures = mantissa.replace(".", "");
  const places = figures.length - 1 - Number(power);
  if (places <= 0 || places > 60 || figures.length < 15 || !Number.isInteger(size * 2 ** 40)) return text;
  const whole = BigInt(figures);
  if (2n * BigInt(size * 2 ** 40) * 10n ** BigInt(places) !== (2n * whole + 1n) << 40n) return text;
  const next = String(whole + 1n);
  return `${next[0]}.${next.slice(1)}e${power}`;
};

/** A number as `epiloom export --to csv` writes it: the shortest decimal that reads back as the same bits. */
const digits = (value) => {
  if (value === null || value === undefined) return "";
  if (typeof value === "string") return value; // what JSON cannot hold
  if (Number.isNaN(value)) return "NaN";
  if (value === Infinity) return "inf";
  if (value === -Infinity) return "-inf";
  if (value === 0) return Object.is(value, -0) ? "-0" : "0";
  const size = Math.abs(value);
  const sign = value < 0 ? "-" : "";
  const text = size.toExponential();
  const best = greaterOfTwo(size, text);
  if (size < 1e-4 || size >= 1e15) return sign + best.replace("e+", "e");
  if (best === text) return String(value);
  const [mantissa, power] = best.split("e");
  const figures = mantissa.replace(".", "");
  const before = Number(power) + 1;
  return sign + (before > 0 ? `${figures.slice(0, before)}.${figures.slice(before)}` : `0.${"0".repeat(-before)}${figures}`);
};

/** A cell of a CSV file: in quotes where it must be. */
const csvCell = (text) => (/[",\r\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text);

/** Lines of a CSV file; a line of one empty cell is written as an empty text in quotes. */
const csvText = (lines) =>
  lines.map((cells) => (cells.length === 1 && cells[0] === "" ? '""' : cells.map(csvCell).join(",")) + "\n").join("");
