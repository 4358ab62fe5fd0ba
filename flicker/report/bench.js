// The camera bench: what a camera records of the light that stands in the page, computed here and now.
// Units are SI inside; a family is a set of lines that keep step, or an exact pulse. Definitions are those of
// `flicker bands`: contrast is (max - min)/(max + min), of the worst start phase.
const COARSE = 256;
const FINE = 1024;
const STANDS = 60; // a light that needs longer than this for one cycle against the frames stands still [s]
const whole = (x) => ((x % 1) + 1) % 1;
const folded = (x) => x - Math.round(x);
const sinc = (x) => (x === 0 ? 1 : Math.sin(Math.PI * x) / (Math.PI * x));
const ratio = (high, low) => (high - Math.max(low, 0) > 1e-9 ? (high - Math.max(low, 0)) / (high + Math.max(low, 0)) : 0);

function pulseLevels({ frequency, decay, duty }) {
  if (decay === 0 || duty === 1) return [duty < 1 ? 0 : 1, 1];
  const rate = 1 / (frequency * decay);
  const highest = Math.expm1(-duty * rate) / Math.expm1(-rate);
  return [highest * Math.exp(-(1 - duty) * rate), highest];
}

// Integral of a pulse over the phase, from phase 0; it grows by 1 a cycle.
function pulseIntegral(pulse, phase) {
  const cycles = Math.floor(phase), inside = phase - cycles, decay = pulse.frequency * pulse.decay;
  let response = Math.min(inside, pulse.duty);
  if (decay > 0) {
    const [lowest, highest] = pulseLevels(pulse), after = Math.max(inside - pulse.duty, 0);
    response += (1 - lowest) * decay * Math.expm1(-response / decay) - highest * decay * Math.expm1(-after / decay);
  }
  const mean = pulse.low + (1 - pulse.low) * pulse.duty;
  return cycles + (pulse.low * inside + (1 - pulse.low) * response) / mean;
}

// Complex amplitude of a harmonic of a pulse, relative to the mean.
function pulseLine(pulse, number) {
  const mean = pulse.low + (1 - pulse.low) * pulse.duty;
  const size = (2 * pulse.duty * sinc(number * pulse.duty) * (1 - pulse.low)) / mean;
  const turn = -Math.PI * number * pulse.duty, lag = 2 * Math.PI * number * pulse.frequency * pulse.decay;
  const re = size * Math.cos(turn), im = size * Math.sin(turn), divisor = 1 + lag * lag;
  return [(re + im * lag) / divisor, (im - re * lag) / divisor];
}

// Factor that an exposure leaves of a line; binned sensor lines collect again, one step later each.
function transfer(frequency, seen) {
  const size = sinc(frequency * seen.exposure), middle = Math.PI * frequency * seen.exposure;
  let re = 0, im = 0;
  for (let step = 0; step < seen.binning; step++) {
    const turn = middle + 2 * Math.PI * frequency * step * seen.step;
    re += (size * Math.cos(turn)) / seen.binning;
    im += (size * Math.sin(turn)) / seen.binning;
  }
  return [re, im];
}

// In place, 2^n points, sign +1: sum of spectrum[k] exp(2 pi i k p / size).
function fourier(re, im) {
  const size = re.length;
  for (let i = 1, j = 0; i < size; i++) {
    let bit = size >> 1;
    for (; j & bit; bit >>= 1) j ^= bit;
    j ^= bit;
    if (i < j) [re[i], re[j], im[i], im[j]] = [re[j], re[i], im[j], im[i]];
  }
  for (let length = 2; length <= size; length <<= 1) {
    const half = length >> 1;
    for (let k = 0; k < half; k++) {
      const c = Math.cos((Math.PI * k) / half), s = Math.sin((Math.PI * k) / half);
      for (let a = k; a < size; a += length) {
        const b = a + half, x = re[b] * c - im[b] * s, y = re[b] * s + im[b] * c;
        re[b] = re[a] - x; im[b] = im[a] - y; re[a] += x; im[a] += y;
      }
    }
  }
}

// Deviation from the mean over one cycle, from harmonics [number, re, im].
function tableOfLines(harmonics) {
  const highest = harmonics.reduce((most, [number]) => Math.max(most, number), 1);
  let size = FINE;
  while (size < 4 * highest) size *= 2;
  const re = new Float64Array(size), im = new Float64Array(size);
  for (const [number, x, y] of harmonics) { re[number] += x; im[number] += y; }
  fourier(re, im);
  return re;
}

const times = ([a, b], [c, d]) => [a * c - b * d, a * d + b * c];

// Deviation that an exposure collects, against the phase at which it starts: a table over one cycle.
function blurred(family, seen) {
  if (!family.harmonics) {
    const cycles = family.frequency * seen.exposure, table = new Float64Array(4 * FINE);
    for (let place = 0; place < table.length; place++) {
      for (let step = 0; step < seen.binning; step++) {
        const phase = place / table.length + step * seen.step * family.frequency;
        table[place] += pulseIntegral(family, phase + cycles) - pulseIntegral(family, phase);
      }
      table[place] = table[place] / (seen.binning * cycles) - 1;
    }
    return table;
  }
  return tableOfLines(family.harmonics.map(([number, re, im]) =>
    [number, ...times([re, im], transfer(number * family.frequency, seen))]));
}

// The same for the mean of all lines of a frame.
function averaged(family, seen, lineTime, lines) {
  const harmonics = family.harmonics ?? Array.from({ length: 2048 }, (_, k) => [k + 1, ...pulseLine(family, k + 1)]);
  return tableOfLines(harmonics.map(([number, re, im]) => {
    const turns = number * family.frequency * lineTime, divisor = Math.sin(Math.PI * turns);
    const mean = Math.abs(divisor) < 1e-9 ? Math.cos(Math.PI * (lines - 1) * Math.round(turns))
      : Math.sin(Math.PI * lines * turns) / (lines * divisor);
    const turn = Math.PI * (lines - 1) * turns;
    const left = times([re, im], transfer(number * family.frequency, seen));
    return [number, ...times(left, [mean * Math.cos(turn), mean * Math.sin(turn)])];
  }));
}

// Between the places of a table, by cubic pieces.
function at(table, phase) {
  const size = table.length, place = whole(phase) * size, first = Math.floor(place), u = place - first;
  const y = (step) => table[(first + step + size) % size];
  const a = y(-1), b = y(0), c = y(1), d = y(2);
  return b + 0.5 * u * (c - a + u * (2 * a - 5 * b + 4 * c - d + u * (3 * (b - c) + d - a)));
}

// A rectangle in closed form: `reach` is how far apart in phase two exposures lie at most.
function rectangleContrast(pulse, exposure, reach) {
  const cycles = pulse.frequency * exposure, number = Math.floor(cycles), rest = cycles - number;
  const share = 1 - pulse.low;
  const lowest = pulse.low * cycles + share * (number * pulse.duty + Math.max(0, rest + pulse.duty - 1));
  const ramp = Math.min(rest, 1 - rest, pulse.duty, 1 - pulse.duty);
  const rise = share * Math.min(ramp, reach < 1e-9 ? 0 : reach);
  return rise > 0 ? rise / (2 * lowest + rise) : 0;
}

// Deepest pair of phases for one lag of each family: (1 - c) there - (1 + c) here, until c grows no more.
function deepest(tables, here, lags) {
  const size = FINE, there = tables.map((table, number) => {
    const values = new Float64Array(size);
    for (let place = 0; place < size; place++) values[place] = at(table, place / size + lags[number]);
    return values;
  });
  for (let found = 0, round = 0; ; round++) {
    let high = 1, low = 1;
    here.forEach((values, number) => {
      const others = there[number];
      let best = -Infinity, chosen = 0;
      for (let place = 0; place < size; place++) {
        const score = (1 - found) * others[place] - (1 + found) * values[place];
        if (score > best) [best, chosen] = [score, place];
      }
      high += others[chosen];
      low += values[chosen];
    });
    const better = ratio(high, low);
    if (better <= found + 1e-12 || round > 30) return Math.max(found, better);
    found = better;
  }
}

// Largest contrast between two of the exposures that start `delays` after a first one, from `most` of the rows.
function contrastOf(tables, frequencies, delays, most) {
  if (!tables.length || !delays.length) return 0;
  const rows = new Map(); // bins of the lags -> a few of the rows that share them
  const ideal = tables.map(fromDarkestToBrightest);
  let nearest = null, least = Infinity; // the row that comes nearest to that way of every light
  for (const delay of delays) {
    for (const sign of [1, -1]) {
      const lags = frequencies.map((frequency) => whole(sign * delay * frequency));
      const missed = lags.reduce((sum, lag, number) => sum + Math.abs(folded(lag - ideal[number])), 0);
      if (missed < least) [least, nearest] = [missed, lags];
      const key = lags.map((lag) => Math.round(lag * COARSE) % COARSE).join();
      if (!rows.has(key)) rows.set(key, []);
      const members = rows.get(key);
      if (members.length < 4) members.push(lags);
      else members[3] = lags;
    }
  }
  const coarse = tables.map((table) => Array.from({ length: COARSE }, (_, k) => table[(k * table.length) / COARSE]));
  let found = 0, order = [];
  for (let round = 0; round < 30; round++) {
    const best = coarse.map((table) => bestOfEachLag(table, found));
    order = [...rows.keys()].map((key) => {
      const bins = key.split(",").map(Number);
      return [bins.reduce((sum, bin, number) => sum + best[number].score[bin], 0), bins, key];
    }).sort((one, other) => other[0] - one[0]);
    let high = 1, low = 1;
    order[0][1].forEach((bin, number) => {
      const phase = best[number].phase[bin];
      high += coarse[number][(phase + bin) % COARSE];
      low += coarse[number][phase];
    });
    const better = ratio(high, low);
    if (better <= found + 1e-12) break;
    found = better;
  }
  const rowsTried = [nearest, ...order.slice(0, 12).flatMap(([, , key]) => rows.get(key)).slice(0, most)];
  const here = tables.map((table) => table.filter((_, place) => place % (table.length / FINE) === 0));
  return Math.max(...rowsTried.map((lags) => deepest(tables, here, lags)));
}

// How far in phase a light's brightest exposure lies behind its darkest one. [cycles]
function fromDarkestToBrightest(table) {
  let darkest = 0, brightest = 0;
  table.forEach((value, place) => {
    if (value < table[darkest]) darkest = place;
    if (value > table[brightest]) brightest = place;
  });
  return (brightest - darkest) / table.length;
}

function bestOfEachLag(table, found) {
  const score = new Float64Array(COARSE).fill(-Infinity), phase = new Int32Array(COARSE);
  for (let lag = 0; lag < COARSE; lag++) {
    for (let place = 0; place < COARSE; place++) {
      const value = (1 - found) * table[(place + lag) % COARSE] - (1 + found) * table[place];
      if (value > score[lag]) { score[lag] = value; phase[lag] = place; }
    }
  }
  return { score, phase };
}

function worstContrast(families, seen, delays, most = 24) {
  if (!families.length || !delays.length) return 0;
  const [first] = families;
  if (families.length === 1 && !first.harmonics && first.decay === 0 && seen.binning === 1) {
    let reach = 0;
    for (const delay of delays) reach = Math.max(reach, Math.abs(folded(delay * first.frequency)));
    return rectangleContrast(first, seen.exposure, reach);
  }
  return contrastOf(families.map((one) => blurred(one, seen)), families.map((one) => one.frequency), delays, most);
}

const windowOf = (camera, exposure) => ({ exposure, binning: camera.binning, step: camera.lineTime / camera.binning });
const apparentLineTime = (camera) =>
  (camera.shutter === "global" ? 0 : camera.lineTime - camera.lightScan / camera.lines);

function lineDelays(camera) {
  const step = Math.abs(apparentLineTime(camera));
  return camera.shutter === "global" ? [] : Array.from({ length: camera.lines - 1 }, (_, k) => (k + 1) * step);
}

function frameDelays(camera, families) {
  const moves = families.some((one) =>
    Math.abs(folded(one.frequency / camera.frameRate)) * camera.frameRate * STANDS >= 1);
  const frames = Math.max(2, Math.min(Math.floor(STANDS * camera.frameRate), 20000));
  return moves ? Array.from({ length: frames - 1 }, (_, k) => (k + 1) / camera.frameRate) : [];
}

function frameFlicker(families, camera, seen) {
  const delays = frameDelays(camera, families);
  if (camera.shutter === "global") return worstContrast(families, seen, delays);
  const lineTime = apparentLineTime(camera);
  const means = families.map((one) => averaged(one, seen, lineTime, camera.lines));
  return contrastOf(means, families.map((one) => one.frequency), delays, 24);
}

// The line that keeps the most contrast, or the light's strongest one where nothing is left of any.
function strongest(light, seen) {
  const lines = light.channels.flatMap((channel) => channel.lines ?? channel.families.flatMap((pulse) =>
    Array.from({ length: channel.pulseLines }, (_, k) => [(k + 1) * pulse.frequency, Math.hypot(...pulseLine(pulse, k + 1))])));
  const left = lines.map(([frequency, size]) => size * Math.hypot(...transfer(frequency, seen)));
  const ranks = Math.max(...left) > 1e-9 ? left : lines.map(([, size]) => size);
  const most = Math.max(...ranks);
  return lines.length && most > 0 ? lines[ranks.indexOf(most)][0] : null;
}

// What a camera records of a light: the figures of `flicker bands`.
function predict(light, camera) {
  const seen = windowOf(camera, camera.exposure), delays = lineDelays(camera), contrast = {}, flicker = {};
  for (const channel of light.channels) {
    contrast[channel.name] = 100 * worstContrast(channel.families, seen, delays);
    flicker[channel.name] = 100 * frameFlicker(channel.families, camera, seen);
  }
  const frequency = strongest(light, seen);
  const said = { contrast, flicker, frequency, period: null, bands: 0, drift: null, seconds: null, standing: false, aliased: false };
  if (frequency === null) return said;
  const beat = folded(frequency / camera.frameRate);
  said.standing = Math.abs(beat) * camera.frameRate * STANDS < 1;
  said.seconds = Math.abs(beat) * camera.frameRate > 1e-9 ? 1 / Math.abs(beat * camera.frameRate) : null;
  if (camera.shutter === "global") return said;
  const turns = frequency * apparentLineTime(camera), perLine = folded(turns);
  said.aliased = Math.abs(turns) > 0.5;
  said.bands = camera.lines * Math.abs(perLine);
  if (Math.abs(perLine) >= 1e-12) {
    said.period = 1 / Math.abs(perLine);
    said.drift = -beat / perLine;
  }
  return said;
}

// What ranks an exposure, from fewer rows since it is asked for hundreds: bands, and pulsing where no band averages it down. [%]
function depth(light, camera, exposure) {
  const seen = windowOf(camera, exposure), delays = lineDelays(camera);
  const slowest = Math.min(...light.channels.flatMap((channel) => channel.families.map((one) => one.frequency)));
  const pulsing = camera.shutter === "global" || slowest * camera.lines * camera.lineTime < 1;
  return 100 * Math.max(0, ...light.channels.map(({ families }) => Math.max(
    worstContrast(families, seen, delays, 6),
    pulsing ? worstContrast(families, seen, frameDelays(camera, families), 6) : 0)));
}
