// Steps through the runs of the page: values in a table, a line in the waveform, a ring on the flow map.
(function () {
  "use strict";
  const SVG = "http://www.w3.org/2000/svg";
  const byId = (id) => document.getElementById(id);
  const data = JSON.parse(byId("runs").textContent);
  if (data.runs.length === 0) return;

  const slider = byId("slider");
  const choice = byId("slider-run");
  const back = byId("slider-back");
  const on = byId("slider-on");
  const body = byId("values").tBodies[0];
  let run = null;

  function element(name, attributes) {
    const made = document.createElementNS(SVG, name);
    for (const key of Object.keys(attributes)) made.setAttribute(key, attributes[key]);
    return made;
  }

  // a picture of the page again, with something drawn over it
  function stage(svg, id, size, mark) {
    svg.setAttribute("viewBox", "0 0 " + size[0] + " " + size[1]);
    svg.setAttribute("width", size[0]);
    svg.setAttribute("height", size[1]);
    svg.replaceChildren(element("use", { href: "#" + id }), mark);
  }

  const line = element("g", { id: "slider-cursor", visibility: "hidden" });
  line.append(
    element("path", { d: "M0 0", stroke: "#ffffff", "stroke-width": "4", "stroke-opacity": "0.7", fill: "none" }),
    element("path", { d: "M0 0", stroke: "#7a3fa0", "stroke-width": "2", fill: "none" }),
    element("path", { d: "M0 0", fill: "#7a3fa0" })
  );
  const ring = element("rect", {
    id: "slider-ring", fill: "none", stroke: "#7a3fa0", "stroke-width": "4", rx: "11", visibility: "hidden",
  });

  // where an instant is on the axis of a run; null beside it
  function pixel(time) {
    const pieces = run.scale;
    if (pieces.length === 0 || time < pieces[0][0] || time > pieces[pieces.length - 1][1]) return null;
    let before = pieces[0];
    for (const piece of pieces) {
      if (time <= piece[1]) {
        const from = time >= piece[0] ? piece : [before[1], piece[0], before[3], piece[2]];
        return from[2] + ((time - from[0]) / (from[1] - from[0] || 1)) * (from[3] - from[2]);
      }
      before = piece;
    }
    return null;
  }

  // the last entry of a list of [number of an instant, what] that is not after an instant
  function latest(list, instant) {
    let found = null;
    for (const entry of list) {
      if (entry[0] > instant) break;
      found = entry;
    }
    return found;
  }

  function load(number) {
    run = data.runs[number];
    choice.value = String(number);
    slider.max = String(run.at.length - 1);
    stage(byId("slider-waves"), run.id, run.size, line);
    const cut = byId("slider-cut");
    cut.hidden = !run.cut;
    cut.textContent = run.cut || "";
    // a picture of a part of the run: begin with that part
    show(Math.max(0, run.at.findIndex((time) => pixel(Number(time)) !== null)));
  }

  function show(instant) {
    slider.value = String(instant);
    const values = Array.from(run.start);
    const since = values.map(() => 0);
    for (let i = 0; i <= instant; i++) {
      const moves = run.moves[i];
      for (let k = 0; k < moves.length; k += 2) {
        values[moves[k]] = "01X"[moves[k + 1]];
        since[moves[k]] = i;
      }
    }
    const moved = [];
    for (let net = 0; net < values.length; net++) {
      const cells = body.rows[net].cells;
      const now = instant > 0 && since[net] === instant;
      cells[1].textContent = values[net] + (now ? (values[net] === "1" ? " ↑" : values[net] === "0" ? " ↓" : " ?") : "");
      cells[2].textContent = run.at[since[net]];
      body.rows[net].className = now ? "moved" : "";
      if (now) moved.push(data.nets[net] + " → " + values[net]);
    }
    const step = latest(run.steps, instant);
    const rest = latest(run.rest, instant);
    const state = rest ? rest[1] : -1;
    const place = state >= 0 ? "at rest in S" + (state + 1) : state === -1 ? "moving" : "at rest outside the flow table";
    const changes = moved.length > 4 ? moved.slice(0, 4).join(", ") + " and " + (moved.length - 4) + " more" : moved.join(", ");
    const words = [run.at[instant] + " " + data.unit, "instant " + (instant + 1) + " of " + run.at.length];
    words.push(step ? (step[0] === instant ? step[1] : "after " + step[1]) : "before the first step");
    if (changes) words.push(changes);
    words.push(place);
    byId("slider-time").textContent = words.join(" · ");
    slider.setAttribute("aria-valuetext", words[0] + ", " + words[2] + ", " + place);
    back.disabled = instant === 0;
    on.disabled = instant === run.at.length - 1;
    draw(instant, state, place);
  }

  function draw(instant, state, place) {
    const x = pixel(Number(run.at[instant]));
    line.setAttribute("visibility", x === null ? "hidden" : "visible");
    if (x !== null) {
      const at = x.toFixed(1), top = run.lanes[0] - 2, end = run.lanes[1];
      line.children[0].setAttribute("d", "M" + at + " " + top + "V" + end);
      line.children[1].setAttribute("d", "M" + at + " " + top + "V" + end);
      line.children[2].setAttribute("d", "M" + at + " " + top + "l5 -8h-10z");
    }
    const box = data.map.boxes[state];
    ring.setAttribute("visibility", box ? "visible" : "hidden");
    if (box) {
      const [left, top, width, height] = box;
      ring.setAttribute("x", left - 5);
      ring.setAttribute("y", top - 5);
      ring.setAttribute("width", width + 10);
      ring.setAttribute("height", height + 10);
    }
    const off = state >= 0 && !box ? " (not on the map, which shows a part)" : "";
    byId("slider-box").textContent = "Now " + place + off + ".";
  }

  data.runs.forEach((one, number) => choice.add(new Option(one.name, String(number))));
  for (const net of data.nets) {
    const row = body.insertRow();
    const head = document.createElement("th");
    head.scope = "row";
    head.textContent = net;
    row.append(head);
    row.insertCell();
    row.insertCell();
  }
  stage(byId("slider-map"), data.map.id, data.map.size, ring);
  choice.addEventListener("change", () => load(Number(choice.value)));
  slider.addEventListener("input", () => show(Number(slider.value)));
  back.addEventListener("click", () => show(Math.max(0, Number(slider.value) - 1)));
  on.addEventListener("click", () => show(Math.min(run.at.length - 1, Number(slider.value) + 1)));
  for (const button of document.querySelectorAll("[data-step-through]")) {
    const number = data.runs.findIndex((one) => one.id === button.dataset.stepThrough);
    if (number < 0) continue;
    button.hidden = false;
    button.addEventListener("click", () => {
      load(number);
      byId("stepping").scrollIntoView();
      slider.focus({ preventScroll: true });
    });
  }
  for (const part of document.querySelectorAll("[data-scripted]")) part.hidden = false;
  load(0);
})();
