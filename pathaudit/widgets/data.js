// The audit's columns as they arrive from Python, and how numbers are written.

// The reverse of Scene.packed (scene.py): inflate, put the byte planes together, sum the steps. Gives name -> list of Float32Array.
export async function unpack(block, layout) {
  const inflated = new Blob([block]).stream().pipeThrough(new DecompressionStream("deflate"));
  const planes = new Uint8Array(await new Response(inflated).arrayBuffer());
  const count = planes.length / 4;
  const words = new Uint32Array(count);
  for (let i = 0, sum = 0; i < count; i++) {
    sum = (sum + (planes[i] | (planes[count + i] << 8) | (planes[2 * count + i] << 16) | (planes[3 * count + i] << 24))) | 0;
    words[i] = sum;
  }
  const floats = new Float32Array(words.buffer);
  const samples = count / layout.reduce((sum, [, columns]) => sum + columns, 0);
  const data = {};
  let next = 0;
  for (const [name, columns] of layout) {
    data[name] = Array.from({ length: columns }, () => floats.subarray(samples * next, samples * ++next));
  }
  return data;
}

// Index of the sample nearest to a time, in an increasing column.
export function nearest(column, value) {
  let low = 0, high = column.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (column[middle] < value) low = middle; else high = middle;
  }
  return value - column[low] <= column[high] - value ? low : high;
}

export function clamp(value, low, high) {
  return Math.min(high, Math.max(low, value));
}

export function fixed(value, digits) {
  return Number.isFinite(value) ? value.toFixed(digits) : "–";
}

// The joint with the largest share of its speed limit at sample i: [joint, percent], or null where nothing is known.
export function worstJoint(data, i) {
  let joint = -1;
  data.share_percent.forEach((column, j) => {
    if (column[i] >= 0 && (joint < 0 || column[i] > data.share_percent[joint][i])) joint = j;
  });
  return joint < 0 ? null : [joint, data.share_percent[joint][i]];
}

// Round steps for an axis: about `wanted` of them over `range`.
export function niceStep(range, wanted) {
  const rough = range / Math.max(1, wanted) || 1;
  const power = 10 ** Math.floor(Math.log10(rough));
  return power * [1, 2, 5, 10].find((k) => k * power >= rough * 0.999);
}
