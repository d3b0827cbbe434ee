"use strict";
(() => {
const root = document.documentElement;
root.classList.add("scripted");
const all = (query, from = document) => [...from.querySelectorAll(query)];
const make = (tag, text, attributes = {}) => {
  const element = document.createElement(tag);
  if (text !== undefined) element.textContent = text;
  for (const [name, value] of Object.entries(attributes)) element.setAttribute(name, value);
  return element;
};
// A name may turn the direction of writing; <bdi> keeps that to itself.
const isolated = text => make("bdi", text);
const PAGE = 100;
const number = text => {
  const value = parseFloat(text.replace(/[,%\s]/g, "").replace("\u2212", "-"));
  return Number.isNaN(value) ? -Infinity : value;
};

// Tables: the rows themselves are read, sorted and filtered; only a page of them stands in the document.
const tables = {};
class Rows {
  constructor(table) {
    this.table = table;
    this.body = table.tBodies[0];
    this.rows = [...this.body.rows];
    this.heads = [...table.tHead.rows[0].cells].map((cell, at) => ({
      cell, at, key: cell.dataset.k, group: cell.dataset.g || "",
      title: cell.querySelector(".t").textContent,
      unit: (cell.querySelector(".u") || {textContent: ""}).textContent,
    }));
    this.kept = this.rows;
    this.order = this.rows;
    this.page = 0;
    this.words = null;
    this.text = this.heads.map(head => {
      const first = this.rows[0] && this.rows[0].cells[head.at];
      return !first || getComputedStyle(first).textAlign === "left";
    });
    this.addTools();
    this.show();
  }
  column(key, group = "") {
    const head = this.heads.find(h => h.key === key && (!h.group || !group || h.group === group));
    return head ? head.at : -1;
  }
  cell(row, key, group = "") {
    const at = this.column(key, group);
    return at < 0 || !row || !row.cells[at] ? "" : row.cells[at].textContent;
  }
  addTools() {
    const tools = this.table.closest(".box").querySelector(".tools");
    tools.hidden = false;
    const caption = this.table.closest(".box").querySelector("h3").firstChild.textContent.trim();
    this.filter = make("input", undefined, {
      type: "search", placeholder: "Filter: words, or volume>100", "aria-label": "Filter " + caption,
      autocomplete: "off", spellcheck: "false",
    });
    let wait = 0;
    this.filter.addEventListener("input", () => { clearTimeout(wait); wait = setTimeout(() => this.sift(), 120); });
    this.where = make("span", "", {class: "where", role: "status"});
    this.back = make("button", "Previous", {type: "button"});
    this.next = make("button", "Next", {type: "button"});
    this.back.addEventListener("click", () => { this.page--; this.show(); });
    this.next.addEventListener("click", () => { this.page++; this.show(); });
    tools.append(this.filter, this.back, this.next, this.where);
    for (const head of this.heads) {
      const button = make("button", undefined, {type: "button"});
      button.append(...head.cell.childNodes);
      head.cell.append(button);
      button.addEventListener("click", () => this.sort(head));
    }
  }
  sift() {
    this.words ??= this.rows.map(row => row.textContent.toLowerCase());
    const tests = this.filter.value.trim().toLowerCase().split(/\s+/).filter(Boolean).map(token => this.test(token));
    const place = new Map(this.rows.map((row, at) => [row, at]));
    this.kept = this.order.filter(row => tests.every(test => test(row, place.get(row))));
    this.page = 0;
    this.show();
  }
  test(token) {
    const [, name, sign, value] = /^([^<>=]+)(<=|>=|<|>|=)(.+)$/.exec(token) || [];
    const plain = text => text.toLowerCase().replace(/[\s_-]/g, "");
    const head = name && (this.heads.find(h => plain(h.key) === plain(name))
      || this.heads.find(h => plain(h.key).startsWith(plain(name))));
    if (!head) return (row, at) => this.words[at].includes(token);
    const limit = number(value);
    return row => {
      const text = row.cells[head.at].textContent;
      if (this.text[head.at] || limit === -Infinity) return sign === "=" && text.toLowerCase() === value;
      const found = number(text);
      if (found === -Infinity) return false;
      return {"<": found < limit, ">": found > limit, "=": found === limit, "<=": found <= limit, ">=": found >= limit}[sign];
    };
  }
  sort(head) {
    const down = head.cell.getAttribute("aria-sort") === (this.text[head.at] ? "ascending" : undefined)
      || (!this.text[head.at] && head.cell.getAttribute("aria-sort") !== "descending");
    for (const other of this.heads) other.cell.removeAttribute("aria-sort");
    head.cell.setAttribute("aria-sort", down ? "descending" : "ascending");
    const turn = down ? -1 : 1;
    const keys = new Map(this.rows.map(row => {
      const text = row.cells[head.at].textContent;
      return [row, this.text[head.at] ? text.toLowerCase() : number(text)];
    }));
    this.order = [...this.rows].sort((a, b) => {
      const p = keys.get(a), q = keys.get(b);
      return p === q ? 0 : turn * (p < q ? -1 : 1);
    });
    this.sift();
  }
  show() {
    const pages = Math.max(1, Math.ceil(this.kept.length / PAGE));
    this.page = Math.min(Math.max(0, this.page), pages - 1);
    const first = this.page * PAGE, shown = this.kept.slice(first, first + PAGE);
    this.body.replaceChildren(...shown);
    this.back.disabled = this.page === 0;
    this.next.disabled = this.page >= pages - 1;
    this.back.hidden = this.next.hidden = pages === 1;
    const whole = this.kept.length === this.rows.length ? "" : ` (of ${this.rows.length.toLocaleString("en")})`;
    this.where.textContent = this.kept.length === 0 ? "no row"
      : pages === 1 && !whole ? "" : `rows ${(first + 1).toLocaleString("en")} to ${(first + shown.length).toLocaleString("en")} of ${this.kept.length.toLocaleString("en")}${whole}`;
  }
}
for (const table of all("table.data")) tables[table.id.slice(2)] = new Rows(table);

// Figures of one row, for the card beside the map and for what a screen reader says.
const figures = (rows, row, group) => rows.heads
  .filter(head => !head.group || head.group === group)
  .map(head => [head.title, row.cells[head.at].textContent, head.unit, head.key])
  .filter(([, value]) => value !== "");
// What the title of the card says already, or the map itself.
const TOLD = new Set(["station", "name", "from", "to", "lat", "lon"]);
const card = document.querySelector(".card");
let kept = null;
const source = element => {
  const station = element.classList.contains("s");
  const rows = tables[station ? "stations" : "links"];
  return {station, rows, row: rows && rows.rows[Number(element.dataset.r)], group: element.closest("svg").dataset.g || ""};
};
const titleOf = ({station, rows, row}) => {
  if (!station) {
    const arrow = rows.cell(row, "direction") === "one-way" ? " \u2192 " : " \u2013 ";
    return [rows.cell(row, "from"), arrow, rows.cell(row, "to")];
  }
  const code = rows.cell(row, "station"), name = rows.cell(row, "name");
  return name && name !== code ? [name, " ", "(" + code + ")"] : [code];
};
const fill = (element, keeping) => {
  if (!card) return;
  const from = source(element);
  if (!from.row) return;
  const title = make("h3");
  title.append(...titleOf(from).map(isolated));
  const list = make("dl");
  for (const [name, value, unit, key] of figures(from.rows, from.row, from.group)) {
    if (TOLD.has(key) || (key.startsWith("frequency_") && number(value) === 0)) continue;
    const term = make("dt", name, {"data-k": key}), told = make("dd");
    if (unit) term.append(" ", make("span", unit, {class: "u"}));
    told.append(isolated(value));
    list.append(term, told);
  }
  card.replaceChildren(title);
  if (from.group) card.append(make("p", from.group, {class: "kept"}));
  card.append(list);
  card.classList.toggle("held", keeping);
  if (!keeping) return;
  const button = make("button", "Let go", {type: "button", class: "drop", title: "Esc"});
  button.addEventListener("click", release);
  card.prepend(button);
};
const idle = card && card.firstElementChild.cloneNode(true);
const release = () => {
  if (kept) kept.classList.remove("hot");
  kept = null;
  if (!card) return;
  card.classList.remove("held");
  card.replaceChildren(idle.cloneNode(true));
};
const keep = element => {
  if (kept) kept.classList.remove("hot");
  kept = element;
  element.classList.add("hot");
  fill(element, true);
};
for (const panel of all(".panel, form.od")) panel.hidden = false;

// Maps: one view for all of them, so that structures stay side by side at one scale.
const maps = all(".map svg");
const base = maps.length ? maps[0].viewBox.baseVal : null;
const whole = base && {x: 0, y: 0, w: base.width, h: base.height};
let view = whole && {...whole};
const shown = svg => svg.clientWidth > 0;
const draw = () => {
  for (const svg of maps) {
    svg.setAttribute("viewBox", `${view.x.toFixed(2)} ${view.y.toFixed(2)} ${view.w.toFixed(2)} ${view.h.toFixed(2)}`);
    svg.parentElement.classList.toggle("near", view.w < whole.w * 0.999);
    if (!shown(svg)) continue;
    const k = view.w / svg.clientWidth, s = Math.min(1, Math.max(0.6, Math.sqrt(svg.clientWidth / 900)));
    svg.style.setProperty("--k", k.toFixed(4));
    svg.style.setProperty("--q", (k * s).toFixed(4));
    const legend = document.querySelector(".legend");
    if (legend) legend.style.setProperty("--lq", s.toFixed(3));
    measure(svg, k);
    place(svg, k, s);
  }
};
// The scale bar: a round length, about a sixth of the width.
const measure = (svg, k) => {
  const bar = svg.parentElement.querySelector(".scale"), perPixel = k / Number(svg.dataset.km);
  const wanted = svg.clientWidth / 6 * perPixel, power = 10 ** Math.floor(Math.log10(wanted));
  const length = Math.max(...[1, 2, 5].map(step => step * power).filter(step => step <= wanted));
  bar.style.width = (length / perPixel).toFixed(1) + "px";
  bar.firstElementChild.textContent = (length >= 1 ? length.toLocaleString("en") : String(+length.toPrecision(2))) + " km";
};
// Labels: the most important first, on the first side that covers no label and no station.
const SIDES = [[1, 0, "start"], [-1, 0, "end"], [0, -1, "middle"], [0, 1, "middle"],
  [.75, -.75, "start"], [.75, .75, "start"], [-.75, -.75, "end"], [-.75, .75, "end"]];
const place = (svg, k, s) => {
  const width = svg.clientWidth, height = width * view.h / view.w, taken = [[width - 46, 0, width, 118]]; // the buttons
  const items = all(".l", svg).map(group => {
    group.own ??= {text: group.firstElementChild, at: group.transform.baseVal[0].matrix, dx: +group.firstElementChild.getAttribute("x"),
      dy: +group.firstElementChild.getAttribute("y"), anchor: group.firstElementChild.getAttribute("text-anchor"), m: +group.dataset.m,
      long: group.firstElementChild.getComputedTextLength() || group.firstElementChild.textContent.length * 7};
    return {group, own: group.own, x: (group.own.at.e - view.x) / k, y: (group.own.at.f - view.y) / k, m: group.own.m * s};
  });
  const marks = items.map(item => [item.x - item.m, item.y - item.m, item.x + item.m, item.y + item.m]);
  const first = items.filter(item => item.group.classList.contains("on"));
  for (const item of [...first, ...items.filter(other => !first.includes(other))]) {
    const {group, own} = item, away = item.m + 4;
    let found = null;
    const preferred = SIDES.findIndex(([dx, dy, anchor]) => anchor === own.anchor && Math.sign(dx) === Math.sign(own.dx) && Math.abs(dy * 9 - own.dy + 4.3) < 12 + own.m);
    const sides = preferred > 0 ? [SIDES[preferred], ...SIDES] : SIDES;
    if (item.x > -5 && item.y > -5 && item.x < width + 5 && item.y < height + 5) for (const [dx, dy, anchor] of sides) {
      const left = item.x + dx * away - {start: 0, middle: own.long / 2, end: own.long}[anchor];
      const top = item.y + dy * (away + 5) - 7, box = [left, top, left + own.long, top + 14];
      if (box[0] < 2 || box[1] < 2 || box[2] > width - 2 || box[3] > height - 2) continue;
      const hits = other => box[0] < other[2] && other[0] < box[2] && box[1] < other[3] && other[1] < box[3];
      if (taken.some(hits) || marks.some((mark, at) => items[at] !== item && hits(mark))) continue;
      found = {dx: dx * away, dy: dy * (away + 5) + 4.3, anchor, box};
      break;
    }
    group.classList.toggle("off", !found);
    if (!found) continue;
    taken.push(found.box);
    own.text.setAttribute("x", found.dx.toFixed(1));
    own.text.setAttribute("y", found.dy.toFixed(1));
    own.text.setAttribute("text-anchor", found.anchor);
  }
};
let pending = false;
const redraw = () => { if (!pending) { pending = true; requestAnimationFrame(() => { pending = false; draw(); }); } };
const zoom = (factor, x = view.x + view.w / 2, y = view.y + view.h / 2) => {
  const w = Math.min(whole.w * 1.6, Math.max(whole.w / 60, view.w / factor)), share = w / view.w;
  view = {x: x - (x - view.x) * share, y: y - (y - view.y) * share, w, h: w * whole.h / whole.w};
  clamp();
};
const clamp = () => {
  view.x = Math.min(whole.w * 1.1 - view.w / 2, Math.max(-whole.w * 0.1 - view.w / 2, view.x));
  view.y = Math.min(whole.h * 1.1 - view.h / 2, Math.max(-whole.h * 0.1 - view.h / 2, view.y));
  redraw();
};
const pan = (dx, dy) => { view.x += dx; view.y += dy; clamp(); };
const reset = () => { view = {...whole}; redraw(); };
const stationsOf = svg => all(".stations .s", svg);
const placeOf = element => element.transform.baseVal[0].matrix;
const focusOn = element => {
  const {e, f} = element.classList.contains("s") ? placeOf(element) : {e: null};
  if (e !== null && (e < view.x || f < view.y || e > view.x + view.w || f > view.y + view.h)) {
    view.x = e - view.w / 2; view.y = f - view.h / 2; clamp();
  }
  element.focus({preventScroll: true});
};
const nextStation = (svg, from, dx, dy) => {
  const stations = stationsOf(svg);
  if (!from) return stations[stations.length - 1];
  const here = placeOf(from);
  let best = null, least = Infinity;
  for (const other of stations) {
    const there = placeOf(other), along = (there.e - here.e) * dx + (there.f - here.f) * dy;
    const across = Math.abs((there.e - here.e) * dy) + Math.abs((there.f - here.f) * dx);
    if (other !== from && along > 0.01 && across <= 3 * along && along + 2 * across < least) { least = along + 2 * across; best = other; }
  }
  return best || from;
};
const nextLink = (svg, from) => {
  const rows = tables.links;
  let code = svg.dataset.at;
  if (from && from.classList.contains("s")) svg.dataset.at = code = tables.stations.cell(source(from).row, "station");
  const links = all(".links .k", svg).filter(k => { const {row} = source(k); return !code || rows.cell(row, "from") === code || rows.cell(row, "to") === code; });
  return links[(links.indexOf(from) + 1) % links.length] || from;
};
const ARROWS = {ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, -1], ArrowDown: [0, 1]};
const onKey = (svg, event) => {
  const target = event.target.closest(".k, .s"), arrow = ARROWS[event.key];
  if (event.ctrlKey || event.metaKey || event.altKey) return;
  if (arrow && event.shiftKey) pan(arrow[0] * view.w / 8, arrow[1] * view.h / 8);
  else if (arrow) {
    const from = target && target.classList.contains("s") ? target : stationsOf(svg).find(s => tables.stations.cell(source(s).row, "station") === svg.dataset.at);
    const to = nextStation(svg, from, ...arrow);
    if (to) focusOn(to);
  } else if (event.key === "+" || event.key === "=") zoom(1.5);
  else if (event.key === "-") zoom(1 / 1.5);
  else if (event.key === "0") reset();
  else if (event.key.toLowerCase() === "l") { const link = nextLink(svg, target); if (link) focusOn(link); }
  else if ((event.key === "Enter" || event.key === " ") && target) keep(target);
  else if (event.key === "Escape") { release(); clearPair(); svg.focus({preventScroll: true}); }
  else return;
  event.preventDefault();
};
const pointers = new Map();
let moved = false;
const onPointer = svg => {
  const point = event => { const box = svg.getBoundingClientRect(); return [view.x + (event.clientX - box.left) / box.width * view.w, view.y + (event.clientY - box.top) / box.height * view.h]; };
  svg.addEventListener("pointerdown", event => { if (event.button === 0) { pointers.set(event.pointerId, [event.clientX, event.clientY]); moved = false; } });
  svg.addEventListener("pointermove", event => {
    const old = pointers.get(event.pointerId);
    if (!old) return;
    const now = [event.clientX, event.clientY], k = view.w / svg.clientWidth;
    if (!moved && Math.hypot(now[0] - old[0], now[1] - old[1]) < 5) return;
    if (!moved) { moved = true; svg.setPointerCapture(event.pointerId); }
    const others = [...pointers].filter(([id]) => id !== event.pointerId);
    if (others.length) {
      const [, fixed] = others[0], span = at => Math.hypot(at[0] - fixed[0], at[1] - fixed[1]);
      zoom(span(now) / Math.max(1, span(old)), ...point({clientX: fixed[0], clientY: fixed[1]}));
    } else pan((old[0] - now[0]) * k, (old[1] - now[1]) * k);
    pointers.set(event.pointerId, now);
  });
  for (const end of ["pointerup", "pointercancel"]) svg.addEventListener(end, event => pointers.delete(event.pointerId));
  svg.addEventListener("wheel", event => {
    if (!event.ctrlKey && !event.metaKey) return;
    event.preventDefault();
    zoom(Math.exp(-event.deltaY / 300), ...point(event));
  }, {passive: false});
  svg.addEventListener("dblclick", event => zoom(event.shiftKey ? 0.5 : 2, ...point(event)));
};
for (const svg of maps) {
  svg.setAttribute("tabindex", "0");
  for (const title of all("title", svg)) title.remove();
  for (const element of all(".k, .s", svg)) {
    const from = source(element);
    element.setAttribute("tabindex", "-1");
    element.setAttribute("role", "button");
    element.setAttribute("aria-label", titleOf(from).join("") + ": " + figures(from.rows, from.row, from.group)
      .filter(([, , , key]) => !TOLD.has(key)).slice(0, 7).map(([name, value, unit]) => `${name} ${value} ${unit}`.trim()).join(", "));
  }
  svg.addEventListener("pointerover", event => { const hit = event.target.closest(".k, .s"); if (hit && !kept) fill(hit, false); });
  svg.addEventListener("focusin", event => { const hit = event.target.closest(".k, .s"); if (hit) fill(hit, kept === hit); });
  svg.addEventListener("click", event => {
    if (moved) return;
    const hit = event.target.closest(".k, .s");
    if (hit) keep(hit); else release();
  });
  svg.addEventListener("keydown", event => onKey(svg, event));
  onPointer(svg);
  const buttons = make("div", undefined, {class: "zoom"});
  for (const [text, label, act] of [["+", "Zoom in", () => zoom(1.5)], ["\u2212", "Zoom out", () => zoom(1 / 1.5)], ["\u25a2", "Show all", reset]]) {
    const button = make("button", text, {type: "button", "aria-label": label, title: label});
    button.addEventListener("click", act);
    buttons.append(button);
  }
  svg.parentElement.append(buttons);
}
if (maps.length) {
  new ResizeObserver(redraw).observe(maps[0]);
  for (const input of all(".tabs > input")) input.addEventListener("change", redraw);
  draw();
}

// O-D pairs: their itineraries on the maps and in a table.
const od = tables.itineraries || tables.od;
const found = document.querySelector(".found");
const from = document.getElementById("od-from"), to = document.getElementById("od-to");
function clearPair() {
  if (!found) return;
  found.hidden = true;
  found.replaceChildren();
  for (const svg of maps) { svg.classList.remove("picked"); for (const e of all(".on", svg)) e.classList.remove("on"); }
  for (const row of all("tr.on")) row.classList.remove("on");
  if (maps.length) redraw();
}
const linkIndex = svg => {
  if (!svg.index) {
    svg.index = new Map();
    for (const k of all(".links .k", svg)) {
      const {row} = source(k), rows = tables.links;
      const a = rows.cell(row, "from"), b = rows.cell(row, "to"), mode = rows.cell(row, "mode");
      const ways = rows.cell(row, "direction") === "one-way" ? [[a, b]] : [[a, b], [b, a]];
      for (const [p, q] of ways) for (const key of [`${p} ${q} ${mode}`, `${p} ${q}`]) if (!svg.index.has(key)) svg.index.set(key, k);
    }
  }
  return svg.index;
};
const light = (svg, stops, modes) => {
  for (let i = 0; i + 1 < stops.length; i++) {
    const index = linkIndex(svg), pair = `${stops[i]} ${stops[i + 1]}`;
    const link = index.get(`${pair} ${modes[i] || ""}`) || index.get(pair);
    if (link) link.classList.add("on");
  }
  for (const mark of all(".s, .l", svg)) {
    const row = tables.stations.rows[Number(mark.dataset.r)];
    if (stops.includes(tables.stations.cell(row, "station"))) mark.classList.add("on");
  }
};
const copyTable = (rows, chosen, caption) => {
  const box = make("div", undefined, {class: "scroll", tabindex: "0", role: "region", "aria-label": caption}), table = make("table", undefined, {class: "data"}), head = make("tr");
  for (const h of rows.heads) {
    const th = make("th", undefined, {scope: "col"});
    th.append(...[...h.cell.querySelectorAll(".g, .t, .u")].flatMap(span => [span.cloneNode(true), " "]));
    if (rows.text[h.at]) th.style.textAlign = "left";
    head.append(th);
  }
  const thead = make("thead"), tbody = make("tbody");
  thead.append(head);
  for (const row of chosen) {
    const copy = row.cloneNode(true);
    copy.classList.remove("on");
    [...copy.cells].forEach((cell, at) => { cell.style.textAlign = rows.text[at] ? "left" : "right"; });
    tbody.append(copy);
  }
  table.append(make("caption", caption, {class: "count"}), thead, tbody);
  box.append(table);
  return box;
};
const showPair = (origin, destination) => {
  clearPair();
  const pick = rows => rows ? rows.rows.filter(row => rows.cell(row, "origin") === origin && rows.cell(row, "destination") === destination) : [];
  const chosen = pick(od), left = pick(tables.unserved);
  const title = make("h3");
  title.append(isolated(origin), " \u2192 ", isolated(destination));
  found.replaceChildren(title);
  found.hidden = false;
  if (!chosen.length && !left.length) {
    found.append(make("p", "No O-D demand between these two stations."));
    return;
  }
  if (chosen.length) found.append(copyTable(od, chosen, "Itineraries"));
  else found.append(make("p", "Nothing of it is carried."));
  if (left.length) found.append(copyTable(tables.unserved, left, "Left unserved"));
  for (const row of [...chosen, ...left]) row.classList.add("on");
  for (const svg of maps) {
    if (svg.dataset.g === "difference") continue;
    svg.classList.add("picked");
    for (const row of chosen) {
      const modes = od.cell(row, "modes", svg.dataset.g).split(" ");
      for (const way of od.cell(row, "stations", svg.dataset.g).split(" \u00b7 ")) if (way) light(svg, way.split(" "), modes);
    }
    for (const mark of all(".s, .l", svg)) {
      const code = tables.stations.cell(tables.stations.rows[Number(mark.dataset.r)], "station");
      if (code === origin || code === destination) mark.classList.add("on");
    }
  }
  if (maps.length) redraw();
};
// A station may be given by its code, or by its name as the tables have it.
const codeOf = text => {
  const rows = tables.stations, wanted = text.trim().toLowerCase();
  const by = key => rows.rows.find(row => rows.cell(row, key).toLowerCase() === wanted);
  const row = by("station") || by("name");
  return row ? rows.cell(row, "station") : text.trim();
};
for (const form of all("form.od")) {
  form.addEventListener("submit", event => { event.preventDefault(); showPair(codeOf(from.value), codeOf(to.value)); found.scrollIntoView({block: "nearest"}); });
  form.querySelector(".clear").addEventListener("click", () => { from.value = to.value = ""; clearPair(); });
}
for (const rows of [od, tables.unserved]) if (rows && found) rows.table.tBodies[0].addEventListener("click", event => {
  const row = event.target.closest("tr");
  if (!row || String(getSelection())) return;
  from.value = rows.cell(row, "origin");
  to.value = rows.cell(row, "destination");
  showPair(from.value, to.value);
  document.getElementById("maps").scrollIntoView();
});
document.addEventListener("keydown", event => { if (event.key === "Escape" && !event.target.closest("svg")) { release(); clearPair(); } });
})();
