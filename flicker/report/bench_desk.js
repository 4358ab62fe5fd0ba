// What the reader handles of the camera bench: fields, the picture, the curve, the nearest clean settings.
const FLASHES = 2.5; // a second, that a rolling picture stays below
const REST = 400; // between two frames that are asked for one by one [ms]
const RANGES = { exposure: [1 / 8000, 0.5], frameRate: [10, 240], lineTime: [1e-6, 1e-4], lines: [100, 4320] };
const still = matchMedia("(prefers-reduced-motion: reduce)").matches;
const digits = (value, count) => String(Number(value.toPrecision(count)));
const percentage = (value) => (value < 0.005 ? "0\u00a0%" : `${value.toFixed(value < 99.995 ? 2 : 0)}\u00a0%`);
const angleOf = (camera) => 360 * camera.exposure * camera.frameRate;
const fraction = (exposure) => (exposure >= 0.4 ? digits(exposure, 4) : `1/${digits(1 / exposure, exposure < 1e-3 ? 5 : 4)}`);

function parse(text) {
  const [top, bottom, ...rest] = text.trim().replace(",", ".").split("/").map((part) => (part.trim() ? Number(part) : NaN));
  const value = bottom === undefined ? top : top / bottom;
  return !rest.length && Number.isFinite(value) && value > 0 ? value : null;
}

// Name of the field -> text of a camera, and camera of a text.
const FIELDS = {
  exposure: [(c) => fraction(c.exposure), (c, value) => (c.exposure = value)],
  angle: [(c) => digits(angleOf(c), 5), (c, value) => (c.exposure = value / 360 / c.frameRate)],
  frameRate: [(c) => digits(c.frameRate, 8), (c, value) => (c.frameRate = value)],
  lineTime: [(c) => digits(c.lineTime * 1e6, 7), (c, value) => (c.lineTime = value * 1e-6)],
  lines: [(c) => String(c.lines), (c, value) => (c.lines = Math.min(Math.max(Math.round(value), 2), 20000))],
};

function sightOf(contrast, threshold) {
  return contrast < threshold ? "invisible" : contrast < 3 ? "faint" : contrast < 10 ? "obvious" : "unusable";
}

function rollOf(said, camera) {
  if (said.standing) return "standing still";
  if (said.seconds === null || said.drift === null) return "";
  const every = `one every ${digits(said.seconds, 2)} s`;
  if (Math.abs(1 / said.seconds - camera.frameRate / 2) < 1e-6 * camera.frameRate) return `jumping by half a band, ${every}`;
  const opposite = { down: "up", up: "down", left: "right", right: "left" };
  return `rolling ${said.drift > 0 ? camera.direction : opposite[camera.direction]}, ${every}`;
}

const SVG = "http://www.w3.org/2000/svg";
function drawn(name, attributes, text) {
  const made = document.createElementNS(SVG, name);
  for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
  if (text !== undefined) made.textContent = text;
  return made;
}

// One row of the canvas after the other: mean light of its lines, each channel, `moved` frames on.
function paint(canvas, light, camera, tables, moved) {
  const along = camera.direction === "left" || camera.direction === "right";
  const backwards = camera.direction === "up" || camera.direction === "left";
  const rows = along ? canvas.width : canvas.height, count = camera.lines, step = apparentLineTime(camera);
  const names = ["red", "green", "blue"], coloured = names.every((name) => tables.some((one) => one.name === name));
  const chosen = coloured ? names.map((name) => tables.find((one) => one.name === name)) : [tables[0]];
  const peak = Math.max(...chosen.map((one) => 1 + one.families.reduce((sum, { table }) => sum + Math.max(...table), 0)));
  const levels = chosen.map((one) => {
    const sums = new Float64Array(rows), held = new Int32Array(rows);
    for (let line = 0; line < count; line++) {
      const row = count > 1 ? Math.min(Math.floor((line * rows) / count), rows - 1) : 0;
      let value = 1;
      for (const { table, frequency } of one.families) {
        value += at(table, frequency * line * step + moved * folded(frequency / camera.frameRate));
      }
      sums[row] += value;
      held[row] += 1;
    }
    for (let row = 0; row < rows; row++) sums[row] = held[row] ? sums[row] / held[row] : sums[Math.max(row - 1, 0)];
    return sums;
  });
  const code = (value) => {
    const shown = Math.min(Math.max(value, 0) * Math.min(0.4, 1 / peak), 1);
    return 255 * (shown <= 0.0031308 ? 12.92 * shown : 1.055 * shown ** (1 / 2.4) - 0.055);
  };
  const context = canvas.getContext("2d");
  for (let row = 0; row < rows; row++) {
    const place = backwards ? rows - 1 - row : row, [red, green = red, blue = red] = levels.map((one) => Math.round(code(one[row])));
    context.fillStyle = `rgb(${red} ${green} ${blue})`;
    if (along) context.fillRect(place, 0, 1, canvas.height);
    else context.fillRect(0, place, canvas.width, 1);
  }
}

// How often a table rises through a level in a cycle: so often it flashes.
function flashesOf(table) {
  let low = Infinity, high = -Infinity;
  for (const value of table) { low = Math.min(low, value); high = Math.max(high, value); }
  return Math.max(...[0.25, 0.5, 0.75].map((share) => {
    const level = low + share * (high - low);
    return table.reduce((count, value, place) => count + (table.at(place - 1) < level && value >= level), 0);
  }));
}

// Nothing may flash more often, the quickest frame by frame change included.
function speedOf(camera, tables) {
  const rates = tables.map((one) => one.families.reduce((sum, { table, frequency }) =>
    sum + Math.abs(folded(frequency / camera.frameRate)) * camera.frameRate * flashesOf(table), 0));
  return Math.min(1, FLASHES / Math.max(...rates, 1e-9));
}

function drawCurve(svg, points, camera, limit) {
  const [left, right, top, bottom] = [52, 446, 16, 204], low = points[0][0], high = points.at(-1)[0];
  const most = Math.max(5, Math.min(100, 1.08 * Math.max(...points.map(([, value]) => value))));
  const x = (value) => left + (Math.log(value / low) / Math.log(high / low)) * (right - left);
  const y = (value) => bottom - (Math.min(value, most) / most) * (bottom - top);
  svg.replaceChildren();
  const safe = [];
  points.forEach(([exposure, value], place) => {
    if (value > limit) return;
    if (safe.length && safe.at(-1)[2] === place - 1) [safe.at(-1)[1], safe.at(-1)[2]] = [exposure, place];
    else safe.push([exposure, exposure, place]);
  });
  for (const [from, to] of safe) {
    const width = Math.max(x(to) - x(from), 3), start = (x(from) + x(to) - width) / 2;
    svg.append(drawn("rect", { x: start, y: top, width, height: bottom - top, class: "area safe" }));
    svg.append(drawn("rect", { x: start, y: top, width, height: bottom - top, fill: "url(#hatch)" }));
  }
  const scale = drawn("g", { class: "scale" });
  for (const share of [0, 0.5, 1]) {
    const value = Number((share * most).toPrecision(2));
    scale.append(drawn("path", { d: `M${left} ${y(value)}H${right}`, class: "grid" }));
    scale.append(drawn("text", { x: left - 6, y: y(value) + 4, "text-anchor": "end" }, `${value}`));
  }
  for (const number of [25, 50, 100, 250, 500, 1000, 2500, 8000]) {
    if (1 / number < low * 0.999 || 1 / number > high * 1.001) continue;
    scale.append(drawn("text", { x: x(1 / number), y: bottom + 17, "text-anchor": "middle" }, `1/${number}`));
  }
  svg.append(scale, drawn("path", { d: `M${left} ${bottom}H${right}`, class: "axis" }));
  svg.append(drawn("path", { d: `M${left} ${y(limit)}H${right}`, class: "line held" }));
  const path = points.map(([exposure, value], place) => `${place ? "L" : "M"}${x(exposure).toFixed(1)} ${y(value).toFixed(1)}`);
  svg.append(drawn("path", { d: path.join(""), class: "line light" }));
  svg.append(drawn("text", { x: (left + right) / 2, y: 241, "text-anchor": "middle" }, "exposure (s)"));
  svg.append(drawn("text", { transform: `translate(14 ${(top + bottom) / 2}) rotate(-90)`, "text-anchor": "middle" }, "contrast (%)"));
  const here = Math.min(Math.max(x(camera.exposure), left), right), nearRight = here > (left + right) / 2;
  svg.append(drawn("path", { d: `M${here} ${top}V${bottom}`, class: "line now" }));
  svg.append(drawn("text", { x: here + (nearRight ? -5 : 5), y: top + 10, "text-anchor": nearRight ? "end" : "start", class: "name" }, "yours"));
  const named = safe.map(([from, to]) => (from === to ? fraction(from) : `${fraction(to)} to ${fraction(from)}`));
  svg.setAttribute("aria-label", `Contrast over exposure from ${fraction(low)} to ${fraction(high)} s; safe windows: ${named.slice(-8).join(", ") || "none"}`);
}

// Exposures to look at: evenly by their logarithm, and every whole number of cycles.
function exposuresOf(light, camera) {
  const low = 1 / 8000, high = Math.max(1 / camera.frameRate, 2 * low), found = [];
  for (let place = 0; place <= 200; place++) found.push(low * (high / low) ** (place / 200));
  for (let cycles = 1; cycles <= Math.min(light.frequency * high, 150); cycles++) found.push(cycles / light.frequency);
  return found.filter((one) => one >= low && one <= high * (1 + 1e-9)).sort((one, other) => one - other);
}

// The same while the light's frequency is off by up to a share of it, in steps.
function depthOver(light, camera, exposure, share) {
  const scaled = (scale) => ({ channels: light.channels.map((channel) =>
    ({ ...channel, families: channel.families.map((one) => ({ ...one, frequency: one.frequency * scale })) })) });
  const steps = share > 0 ? [0, -1, 1, -0.75, 0.75, -0.5, 0.5, -0.25, 0.25] : [0];
  return Math.max(...steps.map((step) => depth(scaled(1 + step * share), camera, exposure)));
}

function settings(light, camera, told) {
  const centres = [camera.exposure, 0.5 / camera.frameRate].map((one) => Math.max(1, Math.round(light.frequency * one)));
  const free = [...told.fractions.map((number) => 1 / number), ...told.angles.map((angle) => angle / 360 / camera.frameRate),
    ...centres.flatMap((near) => [near - 1, near, near + 1]).filter((cycles) => cycles > 0).map((cycles) => cycles / light.frequency)];
  const away = (exposure) => Math.abs(Math.log(exposure / camera.exposure));
  const sorted = (told.offered ?? free).filter((one) => one * camera.frameRate <= 1 + 1e-9).sort((one, other) => away(one) - away(other));
  const clean = [];
  for (const exposure of sorted) {
    if (clean.some(([other]) => Math.abs(other / exposure - 1) < 1e-6)) continue;
    const left = depthOver(light, camera, exposure, told.tolerance / 100);
    if (left <= told.limit) clean.push([exposure, left]);
    if (clean.length === 6) break;
  }
  return clean;
}

function setUp(bench) {
  const told = JSON.parse(bench.querySelector('script[type="application/json"]').textContent);
  const { light, camera } = told, examples = new Set(told.examples);
  const find = (selector) => bench.querySelector(selector);
  const canvas = find("canvas"), roll = find(".roll"), field = (name) => find(`input[name="${name}"]`);
  let tables = [], moved = 0, clock = null, waiting = null, stepped = -Infinity;

  function show(typed) {
    for (const [name, [textOf]] of Object.entries(FIELDS)) {
      if (name !== typed) {
        field(name).value = textOf(camera);
        field(name).removeAttribute("aria-invalid");
      }
      const slider = find(`input[data-of="${name}"]`);
      if (!slider) continue;
      const [low, high] = RANGES[name];
      if (document.activeElement !== slider) slider.value = 1000 * (Math.log(camera[name] / low) / Math.log(high / low));
      slider.setAttribute("aria-valuetext", textOf(camera));
    }
    find('select[name="shutter"]').value = camera.shutter;
    for (const one of bench.querySelectorAll(".field[data-field]")) {
      const marked = examples.has(one.dataset.field) || (one.dataset.field === "angle" && examples.has("exposure"));
      one.querySelector(".mark-example").textContent = marked ? " example" : "";
    }
    find(".example").textContent = examples.size
      ? "Fields marked as example are no facts about your camera: set your camera's own before you trust the figures." : "";
    compute();
  }

  function compute() {
    const seen = windowOf(camera, camera.exposure), said = predict(light, camera), isGlobal = camera.shutter === "global";
    tables = light.channels.map(({ name, families }) =>
      ({ name, families: families.map((one) => ({ table: blurred(one, seen), frequency: one.frequency })) }));
    const worst = Math.max(...Object.values(said.contrast)), pulse = Math.max(...Object.values(said.flicker));
    const named = (values) => Object.entries(values).map(([name, value]) => `${light.channels.length > 1 ? `${name} ` : ""}${percentage(value)}`).join(", ");
    const movement = rollOf(said, camera);
    const notes = [];
    if (camera.exposure * camera.frameRate > 1 + 1e-6) notes.push("this exposure does not fit into a frame");
    if (!isGlobal && camera.lineTime * camera.lines * camera.frameRate > 1 + 1e-6) notes.push("reading all lines takes longer than a frame");
    if (said.aliased) notes.push("the light is faster than half the line rate: the bands are its alias");
    const sight = sightOf(isGlobal ? pulse : Math.max(worst, pulse), told.threshold);
    find(".told").textContent = isGlobal ? `${sight}: the whole picture pulses by ${percentage(pulse)}`
      : `${sight}: bands ${percentage(worst)} deep${movement ? `, ${movement}` : ""}`;
    const rows = [
      ["contrast", named(said.contrast)],
      ["frame flicker", named(said.flicker)],
      ["band pitch", said.period === null ? "no bands" : `${digits(said.period, 4)} lines, ${digits(said.bands, 3)} in the picture`],
      ["drift", said.drift === null ? "none" : `${digits(said.drift, 4)} lines a frame${movement ? `, ${movement}` : ""}`],
      ...notes.map((note) => ["note", note]),
    ];
    find(".figures").replaceChildren(...rows.flatMap(([name, text]) => [["dt", name], ["dd", text]]).map(([tag, text]) =>
      Object.assign(document.createElement(tag), { textContent: text })));
    draw();
    clearTimeout(waiting);
    waiting = setTimeout(look, 60);
  }

  // What takes longer follows when the hand rests, in slices that leave the hand free.
  async function look() {
    const mine = waiting, points = [];
    let since = performance.now();
    for (const exposure of exposuresOf(light, camera)) {
      points.push([exposure, depth(light, camera, exposure)]);
      if (performance.now() - since < 15) continue;
      find(".settings").textContent = `Looking through all exposures: ${fraction(exposure)} s.`;
      await new Promise((done) => setTimeout(done));
      if (waiting !== mine) return;
      since = performance.now();
    }
    drawCurve(find(".curve"), points, camera, told.limit);
    const clean = settings(light, camera, told);
    find(".settings").replaceChildren(...(clean.length ? clean.map(([exposure, left]) => {
      const text = `${fraction(exposure)} s, ${digits(360 * exposure * camera.frameRate, 5)}°: ${percentage(left)}`;
      const button = Object.assign(document.createElement("button"), { type: "button", textContent: text });
      button.addEventListener("click", () => { examples.delete("exposure"); camera.exposure = exposure; show(); find(".told").tabIndex = -1; find(".told").focus(); });
      return button;
    }) : ["Nothing that can be dialled in keeps within the limit here; a shutter that is set freely, or a steadier light, may."]));
  }

  function draw() {
    paint(canvas, light, camera, tables, moved);
    canvas.setAttribute("aria-label", `Predicted frame: ${find(".told").textContent}`);
  }

  function stop() {
    cancelAnimationFrame(clock?.id);
    clock = null;
    roll.textContent = still ? "Next frame" : "Start rolling";
    find(".speed").textContent = "";
  }

  function tick(now) {
    const speed = speedOf(camera, tables);
    moved += (Math.min(now - clock.last, 100) / 1000) * camera.frameRate * speed;
    clock = { id: requestAnimationFrame(tick), last: now };
    find(".speed").textContent = speed < 0.99 ? ` slowed down ${digits(1 / speed, 2)} times` : " at the speed of life";
    draw();
  }

  roll.addEventListener("click", () => {
    if (still) {
      if (performance.now() - stepped < REST) return;
      stepped = performance.now();
      moved += 1;
      draw();
    } else if (clock) stop();
    else {
      roll.textContent = "Stop";
      clock = { id: requestAnimationFrame(tick), last: performance.now() };
    }
  });
  find("form").addEventListener("submit", (event) => event.preventDefault());
  find("form").addEventListener("input", ({ target }) => {
    const name = target.dataset.of ?? target.name;
    if (name === "shutter") camera.shutter = target.value;
    else if (target.dataset.of) {
      const [low, high] = RANGES[name], value = low * (high / low) ** (target.value / 1000);
      camera[name] = name === "lines" ? Math.round(value) : value;
    } else {
      const value = parse(target.value);
      target.toggleAttribute("aria-invalid", value === null);
      if (value === null) return;
      FIELDS[name][1](camera, value);
    }
    examples.delete(name === "angle" ? "exposure" : name);
    show(target.dataset.of ? null : name);
  });
  find("form").addEventListener("change", () => show());
  stop();
  show();
}

document.querySelectorAll("section.bench, section.bands-bench").forEach(setUp);
