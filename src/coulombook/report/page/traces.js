// Logs of the runs, drawn large once a run is unfolded: drag to look into a stretch, double click to see all again.

/** Columns that were laid over 16 bits each between a lowest and a highest value, as deflated differences. */
const unpacked = async (log) => {
  const bytes = Uint8Array.from(atob(log.steps), (sign) => sign.charCodeAt(0));
  const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate"));
  const steps = new DataView(await new Response(stream).arrayBuffer());
  const rows = steps.byteLength / 2 / log.ends.length;
  return log.ends.map(([low, high], column) => {
    let at = 0;
    return Array.from({ length: rows }, (_, row) => {
      at = (at + steps.getUint16(2 * (column * rows + row), true)) % 65536;
      return low + ((high - low) * at) / 65535;
    });
  });
};

const digits = (value, most = 5) => Number(value.toPrecision(most)).toString().replace("-", "\u2212");
const between = (low, high) => (digits(low) === digits(high) ? digits(low) : `${digits(low)} to ${digits(high)}`);

const series = (label, scale, colour, shown) => ({ label, scale, stroke: () => ink(colour), width: shown ? 1 : 0.8, points: { show: false } });

/** Ends of an axis: a tenth of room, and never so near that the noise of a steady reading fills it. */
const room = (_, low, high) => {
  const span = Math.max(1.2 * (high - low), 0.04 * Math.max(Math.abs(low), Math.abs(high)), 1e-12);
  const middle = (low + high) / 2;
  return [middle - span / 2, middle + span / 2];
};

/** Window of the run and injections, below the curves. */
const marksOf = (log) => (plot) => {
  const { ctx, bbox } = plot;
  const x = (second) => plot.valToPos(second, "x", true);
  ctx.save();
  ctx.beginPath();
  ctx.rect(bbox.left, bbox.top, bbox.width, bbox.height);
  ctx.clip();
  ctx.fillStyle = ink("--window");
  ctx.fillRect(x(log.window[0]), bbox.top, x(log.window[1]) - x(log.window[0]), bbox.height);
  ctx.strokeStyle = ctx.fillStyle = ink("--injection");
  ctx.lineWidth = devicePixelRatio;
  ctx.setLineDash([4 * devicePixelRatio, 3 * devicePixelRatio]);
  ctx.font = `${12 * devicePixelRatio}px ${ink("--sans")}`;
  for (const [second, name] of log.injections) {
    ctx.beginPath();
    ctx.moveTo(x(second), bbox.top);
    ctx.lineTo(x(second), bbox.top + bbox.height);
    ctx.stroke();
    ctx.fillText(name, x(second) + 3 * devicePixelRatio, bbox.top + 12 * devicePixelRatio);
  }
  ctx.restore();
};

const axis = (scale, label, side, colour) => ({
  scale, label, side, size: 58, labelSize: 18, gap: 4, font: `12px ${ink("--sans")}`, labelFont: `12px ${ink("--sans")}`,
  stroke: () => ink(colour), grid: { show: side !== 1, stroke: () => ink("--rule"), width: 1 },
  ticks: { stroke: () => ink("--rule"), width: 1, size: 5 }, values: (_, ticks) => ticks.map((one) => digits(one)),
});

const drawLog = async (figure) => {
  figure.classList.add("drawn");
  const log = JSON.parse(figure.dataset.log);
  const data = await unpacked(log);
  const single = data.length === 3;
  const kinds = [["I", "I", "--current"], ["E", "E", "--potential"]];
  const drawn = kinds.flatMap(([label, scale, colour]) => (single ? [series(label, scale, colour, true)] : [series(label, scale, colour), series(label, scale, colour)]));
  const tinted = (colour) => () => `${ink(colour)}66`;
  const place = document.createElement("div");
  place.className = "live";
  place.tabIndex = 0;
  place.setAttribute("role", "group");
  place.setAttribute("aria-label", `${figure.dataset.label} Arrow keys move along it, plus and minus look closer or wider, 0 shows all.`);
  figure.querySelector("figcaption").after(place);

  const reading = document.createElement("output");
  reading.className = "reading";
  const whole = [data[0][0], data[0].at(-1)];
  const reset = button("Show all", () => look(...whole));
  reset.disabled = true;
  const hint = document.createElement("span");
  hint.textContent = "Drag to look closer; double click to show all.";
  const tools = document.createElement("div");
  tools.className = "tools";
  tools.append(reset, hint, reading);
  place.after(tools);

  const height = () => (innerWidth < 600 ? 230 : 290);
  const plot = new uPlot(
    {
      width: Math.max(place.clientWidth, 200), height: height(), scales: { x: { time: false }, I: { range: room }, E: { range: room } }, legend: { show: false },
      series: [{}, ...drawn],
      bands: single ? [] : [{ series: [2, 1], fill: tinted("--current") }, { series: [4, 3], fill: tinted("--potential") }],
      axes: [{ ...axis("x", "t / s", 2, "--soft"), size: 34 }, axis("I", "I / mA", 3, "--current"), axis("E", log.potential, 1, "--potential")],
      cursor: { y: false, drag: { x: true, y: false, dist: 5 }, points: { show: false } },
      hooks: {
        drawClear: [marksOf(log)],
        setScale: [(self, key) => {
          if (key === "x") reset.disabled = self.scales.x.min <= whole[0] && self.scales.x.max >= whole[1];
        }],
        setCursor: [(self) => {
          const at = self.cursor.idx;
          if (at === null || at === undefined) return;
          const [current, potential] = single ? [digits(data[1][at]), digits(data[2][at])] : [between(data[1][at], data[2][at]), between(data[3][at], data[4][at])];
          reading.textContent = `t ${digits(data[0][at])} s, I ${current} mA, E ${potential} V`;
        }],
      },
    },
    data,
    place,
  );
  const look = (low, high) => plot.setScale("x", { min: Math.max(low, whole[0]), max: Math.min(high, whole[1]) });

  place.addEventListener("keydown", (event) => {
    const { min, max } = plot.scales.x;
    const at = plot.cursor.left >= 0 ? plot.posToVal(plot.cursor.left, "x") : (min + max) / 2;
    const step = { ArrowLeft: -1, ArrowRight: 1 }[event.key];
    const factor = { "+": 0.5, "=": 0.5, "-": 2 }[event.key];
    if (step) plot.setCursor({ left: Math.min(Math.max(plot.valToPos(at + (step * (max - min)) / 100, "x"), 0), plot.over.clientWidth), top: 10 });
    else if (factor) look(at - (at - min) * factor, at + (max - at) * factor);
    else if (event.key === "0") look(...whole);
    else return;
    event.preventDefault();
  });
  new ResizeObserver(() => {
    const width = place.clientWidth;
    if (width > 0 && width !== plot.width) plot.setSize({ width, height: height() });
  }).observe(place);
  dark.addEventListener("change", () => plot.redraw());
};

// without a way to inflate, the small drawings stay
for (const one of "DecompressionStream" in window ? document.querySelectorAll("details.run") : []) {
  one.addEventListener("toggle", () => {
    const figure = one.querySelector(".trace:not(.drawn)");
    if (one.open && figure) drawLog(figure);
  });
}
