// Moves the network between ground and diagram, sorts and filters tables, and shows rows on the
// picture. The page can be read without it.
"use strict";
(() => {
  const data = JSON.parse(document.getElementById("data").textContent);
  const svg = document.querySelector("svg.net");
  const slider = document.getElementById("move");
  const said = document.getElementById("said");
  const circles = [...svg.querySelectorAll(".stations circle")];
  const courses = [...svg.querySelectorAll(".courses path")];
  const lines = [...svg.querySelectorAll(".grid path")];
  const marks = svg.querySelector(".marks");
  const routes = svg.querySelector(".routes");
  const place = new Map(data.stations.map((station, i) => [station.id, i]));
  const course = new Map();
  data.courses.forEach((part, i) => {
    course.set(part.ends.join("\n"), [i, false]);
    course.set([part.ends[1], part.ends[0]].join("\n"), [i, true]);
  });
  const zoom = document.getElementById("zoom");
  const whole = svg.getAttribute("viewBox").split(" ").map(Number);
  const closest = 0.3;
  let share = 1;
  let shown = null;

  const mix = (from, to) => from.map((value, i) => value + share * (to[i] - value));
  const path = (flat) => {
    let d = "";
    for (let i = 0; i < flat.length; i += 2) {
      d += (i ? "L" : "M") + flat[i].toFixed(1) + " " + flat[i + 1].toFixed(1);
    }
    return d;
  };
  const at = (i) => mix(data.stations[i].t, data.stations[i].d);
  const make = (name, values, parent) => {
    const element = document.createElementNS("http://www.w3.org/2000/svg", name);
    for (const key of Object.keys(values)) element.setAttribute(key, values[key]);
    return parent.appendChild(element);
  };

  function move() {
    share = Number(slider.value) / 100;
    const word = share === 0 ? "ground" : share === 1 ? "diagram" : Math.round(100 * share) + " % on the way to the diagram";
    slider.setAttribute("aria-valuetext", word);
    circles.forEach((circle, i) => {
      const [x, y] = at(i);
      circle.setAttribute("cx", x.toFixed(1));
      circle.setAttribute("cy", y.toFixed(1));
    });
    courses.forEach((part, i) => part.setAttribute("d", path(mix(data.courses[i].t, data.courses[i].d))));
    lines.forEach((line, i) => line.setAttribute("d", path(mix(data.grid[i].t, data.grid[i].d))));
    mark();
  }

  // What a row shows: single stations, pairs of them, or ways through several.
  function mark() {
    marks.replaceChildren();
    routes.replaceChildren();
    svg.classList.toggle("marked", shown !== null);
    const size = frame();
    if (!shown) return;
    const paths = shown.ways.map(wayPath);
    paths.forEach((d) => make("path", {class: "way case", d}, routes));
    paths.forEach((d, i) => make("path", {class: "way " + ["seen", "fast"][i], d}, routes));
    shown.stations.forEach((id) => {
      const [x, y] = at(place.get(id));
      make("circle", {class: "ring", cx: x.toFixed(1), cy: y.toFixed(1), r: 11 * size}, marks);
    });
    shown.stations.forEach((id, i) => {
      const [x, y] = at(place.get(id));
      const below = i > 0 && y >= at(place.get(shown.stations[0]))[1];
      const box = svg.viewBox.baseVal;
      const right = x > box.x + box.width * 0.7;
      const text = make("text", {
        x: (x + size * (right ? -15 : 15)).toFixed(1),
        y: (y + size * (below ? 22 : -9)).toFixed(1),
      }, marks);
      text.textContent = data.stations[place.get(id)].name;
      if (right) text.setAttribute("text-anchor", "end");
    });
  }

  // Shows all, or what is marked; gives how large marks must be to look the same.
  function frame() {
    let box = whole;
    if (shown && zoom.checked) {
      const points = [...shown.stations, ...shown.ways.flat()].map((id) => at(place.get(id)));
      const [xs, ys] = [points.map((p) => p[0]), points.map((p) => p[1])];
      const span = [Math.max(...xs) - Math.min(...xs), Math.max(...ys) - Math.min(...ys)];
      const scale = Math.min(1, Math.max(closest, 1.5 * span[0] / whole[2], 1.5 * span[1] / whole[3]));
      const size = [whole[2] * scale, whole[3] * scale];
      const inside = (low, high, i) => Math.min(Math.max((low + high - size[i]) / 2, 0), whole[i + 2] - size[i]);
      box = [
        inside(Math.min(...xs), Math.max(...xs), 0),
        inside(Math.min(...ys), Math.max(...ys), 1),
        ...size,
      ];
    }
    svg.setAttribute("viewBox", box.map((value) => value.toFixed(1)).join(" "));
    svg.style.setProperty("--k", box[2] / whole[2]);
    return box[2] / whole[2];
  }

  function wayPath(way) {
    let d = "";
    for (let i = 1; i < way.length; i += 1) {
      const found = course.get(way[i - 1] + "\n" + way[i]);
      let points = found
        ? mix(data.courses[found[0]].t, data.courses[found[0]].d)
        : [...at(place.get(way[i - 1])), ...at(place.get(way[i]))];
      if (found && found[1]) {
        const turned = [];
        for (let k = points.length - 2; k >= 0; k -= 2) turned.push(points[k], points[k + 1]);
        points = turned;
      }
      d += path(points);
    }
    return d;
  }

  function show(row) {
    const old = document.querySelector("tr[aria-current]");
    if (old) old.removeAttribute("aria-current");
    if (old === row || !row) {
      shown = null;
      said.textContent = "Nothing marked.";
    } else {
      row.setAttribute("aria-current", "true");
      shown = {
        stations: JSON.parse(row.dataset.stations),
        ways: JSON.parse(row.dataset.ways || "[]"),
      };
      said.textContent = row.dataset.say;
    }
    mark();
  }

  slider.addEventListener("input", move);
  zoom.addEventListener("change", mark);
  document.querySelectorAll("[data-toggles]").forEach((box) => {
    const apply = () => svg.classList.toggle("no-" + box.dataset.toggles, !box.checked);
    box.addEventListener("change", apply);
    apply();
  });
  document.querySelectorAll("input[name=hue]").forEach((radio) => {
    const apply = () => {
      if (!radio.checked) return;
      const figure = document.getElementById("figure");
      figure.dataset.hue = radio.value;
    };
    radio.addEventListener("change", apply);
    apply();
  });
  document.querySelectorAll("button.show").forEach((button) => {
    button.addEventListener("click", () => show(button.closest("tr")));
  });
  circles.forEach((circle, i) => {
    circle.addEventListener("click", () => {
      const row = document.getElementById("station-" + i);
      if (!row) return;
      row.closest("details").open = true;
      if (!row.hasAttribute("aria-current")) show(row);
      row.scrollIntoView({block: "nearest"});
    });
  });
  document.addEventListener("keydown", (event) => {
    if (event.key === "Escape" && shown) show(null);
  });

  document.querySelectorAll("th button").forEach((button) => {
    button.addEventListener("click", () => {
      const head = button.closest("th");
      const body = head.closest("table").tBodies[0];
      const column = head.cellIndex;
      const first = head.dataset.first || "ascending";
      const other = first === "ascending" ? "descending" : "ascending";
      const way = head.getAttribute("aria-sort") === first ? other : first;
      head.parentElement.querySelectorAll("th").forEach((cell) => cell.removeAttribute("aria-sort"));
      head.setAttribute("aria-sort", way);
      const sign = way === "ascending" ? 1 : -1;
      const value = (row) => {
        const cell = row.cells[column];
        return cell.dataset.v === undefined ? cell.textContent.trim() : Number(cell.dataset.v);
      };
      const rows = [...body.rows].map((row, i) => [value(row), i, row]);
      rows.sort((a, b) => {
        const order = typeof a[0] === "number" ? a[0] - b[0] : a[0].localeCompare(b[0]);
        return sign * order || a[1] - b[1];
      });
      body.append(...rows.map((row) => row[2]));
    });
  });
  document.querySelectorAll("input[data-filters]").forEach((field) => {
    field.addEventListener("input", () => {
      const wanted = field.value.trim().toLocaleLowerCase();
      for (const row of document.getElementById(field.dataset.filters).tBodies[0].rows) {
        row.hidden = wanted !== "" && !row.textContent.toLocaleLowerCase().includes(wanted);
      }
    });
  });

  // Closed parts would be missing on paper.
  let closed = [];
  addEventListener("beforeprint", () => {
    closed = [...document.querySelectorAll("details:not([open])")];
    closed.forEach((part) => { part.open = true; });
  });
  addEventListener("afterprint", () => closed.forEach((part) => { part.open = false; }));
  move();
})();
