// A picture drawn by the kernel, and lines over it that the browser itself moves.
//
// The kernel's state (picture, axes box, limits, markers) comes as traits and is the truth. What the
// hand does goes back as messages, never as traits, so that nothing is echoed:
//   {type: "marker", name, x}   x in seconds, null to have it found again
//   {type: "view", low, high, ask}   {type: "view", what: "all" | "step", ask}
//   {type: "room", width, ratio}
const MARKER_HALF = 7; // px to either side that the hand may miss by

function render({ model, el }) {
  el.classList.add("tau-plot");
  el.innerHTML = "";
  const make = (tag, name, parent) => {
    const e = document.createElement(tag);
    e.className = name;
    parent.append(e);
    return e;
  };
  const bar = make("div", "tau-plot-bar", el);
  const stage = make("div", "tau-plot-stage", el);
  const picture = make("img", "tau-plot-picture", stage);
  const pane = make("div", "tau-plot-pane", stage); // clips the moving copy to the axes
  const moving = make("img", "tau-plot-moving", pane);
  picture.draggable = moving.draggable = false;
  moving.alt = "";
  moving.setAttribute("aria-hidden", "true");
  stage.tabIndex = 0;
  stage.setAttribute("role", "group");
  stage.setAttribute("data-lm-suppress-shortcuts", "true");
  stage.setAttribute("aria-label", "Plot. Plus and minus zoom, arrow keys pan, 0 shows the whole log.");

  let url = null;
  let view = null; // what the hand asked for, until the kernel's picture of it is here
  let asked = 0, waiting = false, queued = null, drag = null;
  const lines = {};

  const size = () => model.get("size");
  const box = () => model.get("box");
  const limits = () => view || model.get("limits");
  const left = () => box()[0] * size()[0];
  const wide = () => (box()[2] - box()[0]) * size()[0];
  const toPixel = (x) => { const [a, b] = limits(); return left() + (x - a) / (b - a) * wide(); };
  const toTime = (p) => { const [a, b] = limits(); return a + (p - left()) / wide() * (b - a); };
  const within = (x) => { const [a, b] = model.get("full"); return Math.min(b, Math.max(a, x)); };
  const pixelOf = (event) => event.clientX - stage.getBoundingClientRect().left;
  const digits = () => {
    const [a, b] = limits();
    return Math.min(6, Math.max(0, Math.ceil(1 - Math.log10((b - a) / Math.max(wide(), 1)))));
  };

  // ---------------------------------------------------------------- the view: zoom and pan
  const ask = (what) => {
    if (waiting) { queued = what; return; }
    waiting = true;
    asked += 1;
    model.send({ type: "view", ask: asked, ...what });
  };
  const look = (low, high) => {
    const [a, b] = model.get("full");
    const span = Math.min(Math.max(high - low, (b - a) * 1e-6), b - a);
    if (low < a) { low = a; } else if (low + span > b) { low = b - span; }
    view = [low, low + span];
    slide();
    ask({ low: view[0], high: view[1] });
  };
  const zoom = (factor, at) => {
    const [a, b] = limits();
    const fixed = at === undefined ? (a + b) / 2 : at;
    look(fixed - (fixed - a) * factor, fixed + (b - fixed) * factor);
  };
  const pan = (share) => { const [a, b] = limits(); look(a + share * (b - a), b + share * (b - a)); };
  const slide = () => { // stretch the picture that is there, at once; the right one follows
    const [a, b] = model.get("limits"), [c, d] = limits();
    const scale = (b - a) / (d - c);
    pane.style.display = view ? "block" : "none";
    moving.style.transformOrigin = left() + "px 0";
    moving.style.transform = `translateX(${(a - c) / (d - c) * wide()}px) scaleX(${scale})`;
    Object.values(lines).forEach(place);
  };
  const answered = () => {
    waiting = false;
    if (queued) { const next = queued; queued = null; ask(next); return; }
    if (!drag || drag.marker) { view = null; }
    slide();
  };

  // ---------------------------------------------------------------- markers
  const place = (line) => {
    const m = line.marker, x = toPixel(m.x), [low, high] = limits();
    const words = `${m.label} ${m.x.toFixed(digits())} ${model.get("unit")}`;
    line.style.display = m.x < low || m.x > high ? "none" : "block";
    line.style.left = (x - MARKER_HALF) + "px";
    line.style.top = box()[1] * size()[1] + "px";
    line.style.height = (box()[3] - box()[1]) * size()[1] + "px";
    line.classList.toggle("tau-given", m.given);
    line.firstChild.textContent = words;
    line.setAttribute("aria-label", m.label);
    line.setAttribute("aria-valuenow", m.x);
    line.setAttribute("aria-valuemin", model.get("full")[0]);
    line.setAttribute("aria-valuemax", model.get("full")[1]);
    line.setAttribute("aria-valuetext", words + (m.given ? "" : ", found in the record"));
  };
  const moveTo = (line, x, final) => {
    x = within(x);
    line.marker = { ...line.marker, x, given: true };
    place(line);
    if (final) { model.send({ type: "marker", name: line.marker.name, x }); }
  };
  const newLine = (marker) => {
    const line = make("div", "tau-marker tau-marker-" + marker.name, stage);
    make("span", "tau-flag", line);
    line.tabIndex = 0;
    line.setAttribute("role", "slider");
    line.setAttribute("aria-orientation", "horizontal");
    line.setAttribute("data-lm-suppress-shortcuts", "true");
    line.title = "Drag, or use the arrow keys (with Shift: ten times as far). Delete has it found again.";
    line.addEventListener("pointerdown", (event) => {
      if (event.button !== 0) { return; }
      event.stopPropagation();
      line.setPointerCapture(event.pointerId);
      line.focus();
      drag = { marker: line, from: pixelOf(event), grip: pixelOf(event) - toPixel(line.marker.x), moved: false };
    });
    line.addEventListener("pointermove", (event) => {
      if (!drag || drag.marker !== line) { return; }
      drag.moved = drag.moved || Math.abs(pixelOf(event) - drag.from) > 1;
      if (drag.moved) { moveTo(line, toTime(pixelOf(event) - drag.grip), false); }
    });
    const drop = (event) => {
      if (!drag || drag.marker !== line) { return; }
      const { grip, moved } = drag;
      drag = null;
      if (moved) { moveTo(line, toTime(pixelOf(event) - grip), true); } else { build(); }
    };
    line.addEventListener("pointerup", drop);
    line.addEventListener("pointercancel", () => { drag = null; build(); });
    line.addEventListener("keydown", (event) => {
      const step = { ArrowLeft: -1, ArrowDown: -1, ArrowRight: 1, ArrowUp: 1, PageDown: -20, PageUp: 20 }[event.key];
      if (event.key === "Delete" || event.key === "Backspace") {
        model.send({ type: "marker", name: line.marker.name, x: null });
      } else if (step) {
        moveTo(line, toTime(toPixel(line.marker.x) + step * (event.shiftKey ? 10 : 1)), true);
      } else { return; }
      event.preventDefault();
      event.stopPropagation();
    });
    return line;
  };
  const build = () => {
    const now = model.get("markers");
    for (const marker of now) {
      const line = lines[marker.name] = lines[marker.name] || newLine(marker);
      if (drag && drag.marker === line) { continue; } // the hand holds it
      line.marker = marker;
      place(line);
    }
    for (const name of Object.keys(lines)) {
      if (!now.some((m) => m.name === name)) { lines[name].remove(); delete lines[name]; }
    }
  };

  // ---------------------------------------------------------------- the stage itself
  stage.addEventListener("pointerdown", (event) => {
    if (event.button !== 0) { return; }
    stage.setPointerCapture(event.pointerId);
    drag = { pan: limits().slice(), from: pixelOf(event) };
  });
  stage.addEventListener("pointermove", (event) => {
    if (!drag || drag.marker) { return; }
    const [a, b] = drag.pan, by = (drag.from - pixelOf(event)) / wide() * (b - a);
    if (Math.abs(drag.from - pixelOf(event)) > 2) { look(a + by, b + by); }
  });
  const let_go = () => { if (drag && !drag.marker) { drag = null; if (!waiting) { view = null; slide(); } } };
  stage.addEventListener("pointerup", let_go);
  stage.addEventListener("pointercancel", let_go);
  stage.addEventListener("wheel", (event) => { // without the focus the page scrolls, as elsewhere
    if (!stage.contains(document.activeElement)) { return; }
    event.preventDefault();
    zoom(Math.exp(0.002 * Math.max(-300, Math.min(300, event.deltaY))), toTime(pixelOf(event)));
  }, { passive: false });
  stage.addEventListener("keydown", (event) => {
    if (event.target !== stage || event.ctrlKey || event.metaKey || event.altKey) { return; }
    const act = {
      "+": () => zoom(0.5), "=": () => zoom(0.5), "-": () => zoom(2), "0": () => ask({ what: "all" }),
      ArrowLeft: () => pan(-0.1), ArrowRight: () => pan(0.1),
    }[event.key];
    if (!act) { return; }
    act();
    event.preventDefault();
    event.stopPropagation();
  });
  for (const [words, title, act] of [
    ["Closer", "Zoom in (+)", () => zoom(0.5)],
    ["Wider", "Zoom out (-)", () => zoom(2)],
    ["The step", "Show the window that is fitted", () => ask({ what: "step" })],
    ["Whole log", "Show everything (0)", () => ask({ what: "all" })],
  ]) {
    const button = make("button", "tau-small", bar);
    button.type = "button";
    button.textContent = words;
    button.title = title;
    button.setAttribute("data-lm-suppress-shortcuts", "true");
    button.addEventListener("click", act);
  }
  make("span", "tau-hint", bar).textContent =
    "Drag a line to move it, the plot to pan; the wheel zooms once the plot is clicked.";

  // ---------------------------------------------------------------- from the kernel
  const paint = () => {
    const data = model.get("png");
    stage.style.height = size()[1] + "px";
    const [x0, y0, x1, y1] = box(), [w, h] = size();
    Object.assign(pane.style, {
      left: x0 * w + "px", top: y0 * h + "px", width: (x1 - x0) * w + "px", height: (y1 - y0) * h + "px",
    });
    for (const image of [picture, moving]) { image.style.width = w + "px"; image.style.height = h + "px"; }
    moving.style.left = -x0 * w + "px";
    moving.style.top = -y0 * h + "px";
    picture.alt = model.get("alt");
    const old = url;
    url = data && data.byteLength ? URL.createObjectURL(new Blob([data], { type: "image/png" })) : null;
    picture.style.visibility = url ? "visible" : "hidden";
    if (url) {
      picture.onload = () => {
        moving.src = url;
        if (old) { URL.revokeObjectURL(old); }
        el.dataset.frame = 1 + Number(el.dataset.frame || 0);
      };
      picture.src = url;
    }
    build();
    slide();
  };
  const events = [
    ["change:png", paint], ["change:markers", build], ["change:answered", answered],
    ["change:full", build],
  ];
  for (const [name, call] of events) { model.on(name, call); }

  let told = null, timer = null;
  const room = () => {
    const width = Math.round(el.clientWidth), ratio = window.devicePixelRatio || 1;
    if (width < 100 || told === `${width} ${ratio}`) { return; }
    told = `${width} ${ratio}`;
    model.send({ type: "room", width, ratio });
  };
  const watcher = new ResizeObserver(() => { clearTimeout(timer); timer = setTimeout(room, told ? 150 : 0); });
  watcher.observe(el);
  paint();
  return () => {
    watcher.disconnect();
    clearTimeout(timer);
    for (const [name, call] of events) { model.off(name, call); }
    if (url) { URL.revokeObjectURL(url); }
  };
}
export default { render };
