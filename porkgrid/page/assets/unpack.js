// Blocks of the page back into bytes and grids: what porkgrid/page/pack.py packed.

/** The bytes of a block: base64 text of a zlib stream. */
async function unpackedBytes(number) {
  const text = document.getElementById(`block-${number}`).textContent;
  const stream = new Blob([bytesOfBase64(text)]).stream().pipeThrough(new DecompressionStream("deflate"));
  return new Uint8Array(await new Response(stream).arrayBuffer());
}

/** Base64 text as bytes; browsers from before 2025 have no call for it. */
function bytesOfBase64(text) {
  if (Uint8Array.fromBase64) return Uint8Array.fromBase64(text);
  const signs = atob(text);
  const bytes = new Uint8Array(signs.length);
  for (let at = 0; at < signs.length; at++) bytes[at] = signs.charCodeAt(at);
  return bytes;
}

/** A packed grid as a Uint32Array of bit patterns, row by row. */
async function unpackedGrid(number, rows, columns) {
  return undone(await unpackedBytes(number), rows, columns);
}

/** Byte planes of differences back into values: a running sum along each row, then down each column. */
function undone(bytes, rows, columns) {
  const count = rows * columns;
  const words = new Uint32Array(count);
  for (let row = 0, at = 0; row < rows; row++) {
    let sum = 0;
    for (let column = 0; column < columns; column++, at++) {
      const difference =
        bytes[at] | (bytes[count + at] << 8) | (bytes[2 * count + at] << 16) | (bytes[3 * count + at] << 24);
      sum = (sum + difference) | 0;
      words[at] = row === 0 ? sum : sum + words[at - columns];
    }
  }
  return words;
}
