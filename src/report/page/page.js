"use strict";
(() => {
  const root = document.documentElement;
  const all = (query, from = document) => [...from.querySelectorAll(query)];
  root.classList.add("js");

  // Which tower is shown.
  const choices = all("input[name=tower]");
  const show = (id) => {
    all("article.tower").forEach((article) => article.classList.toggle("shown", article.id === id));
    choices.forEach((choice) => { choice.checked = choice.value === id; });
  };
  choices.forEach((choice) => choice.addEventListener("change", () => show(choice.value)));
  const towers = all("article.tower").map((article) => article.id);
  const follow = () => {
    const id = location.hash.slice(1);
    if (!towers.includes(id)) return false;
    show(id);
    document.getElementById(id).scrollIntoView();
    return true;
  };
  addEventListener("hashchange", follow);
  if (!follow()) show(towers[Math.min(1, towers.length - 1)]);

  // Which storeys of a plan are shown.
  all("fieldset.choice input[data-band]").forEach((input) => {
    const apply = () => {
      const figures = all("figure.band", input.closest("article"));
      figures.forEach((figure) => figure.classList.toggle("shown", !!figure.querySelector("#" + CSS.escape(input.dataset.band))));
    };
    input.addEventListener("change", apply);
    if (input.checked) apply();
  });
  all(".plans").forEach((plans) => {
    if (!plans.querySelector(".shown")) plans.firstElementChild.classList.add("shown");
  });

  // By which result a cubic metre is judged.
  const measure = document.getElementById("measure");
  measure.addEventListener("change", () => { root.dataset.measure = measure.value; });
  root.dataset.measure = measure.value;

  // Motion.
  const motion = document.getElementById("motion");
  motion.addEventListener("click", () => {
    const still = root.classList.toggle("still");
    motion.setAttribute("aria-pressed", String(still));
  });

  // Sorting.
  all("table.sortable").forEach((table) => {
    const heads = all("thead th", table);
    heads.forEach((head, column) => head.querySelector("button").addEventListener("click", () => {
      const falling = head.getAttribute("aria-sort") === "ascending";
      heads.forEach((other) => other.setAttribute("aria-sort", "none"));
      head.setAttribute("aria-sort", falling ? "descending" : "ascending");
      const body = table.tBodies[0];
      const key = (row) => row.cells[column].dataset.value;
      const compare = (a, b) => {
        const [x, y] = [key(a), key(b)];
        if (x === "" || y === "") return (x === "") - (y === "");
        const order = isNaN(x) || isNaN(y) ? x.localeCompare(y) : x - y;
        return falling ? -order : order;
      };
      [...body.rows].sort(compare).forEach((row) => body.append(row));
    }));
  });

  // Values of marks: by mouse, by touch, and by arrow keys.
  const tell = (mark) => {
    const picture = mark.ownerSVGElement;
    const readout = mark.closest("figure")?.querySelector(".readout");
    all(".mark.on", picture).forEach((other) => other.classList.remove("on"));
    mark.classList.add("on");
    if (readout) readout.textContent = mark.querySelector("title").textContent;
  };
  ["pointerover", "pointerdown", "focusin"].forEach((kind) => document.addEventListener(kind, (event) => {
    const mark = event.target.closest?.(".mark");
    if (mark) tell(mark);
  }));
  all("svg.values").forEach((picture) => picture.addEventListener("keydown", (event) => {
    const step = { ArrowRight: 1, ArrowDown: 1, ArrowLeft: -1, ArrowUp: -1 }[event.key];
    if (!step) return;
    event.preventDefault();
    const marks = all(".mark", picture);
    const now = marks.findIndex((mark) => mark.classList.contains("on"));
    const next = now < 0 ? (step > 0 ? 0 : marks.length - 1) : (now + step + marks.length) % marks.length;
    if (marks[next]) { marks[next].focus(); tell(marks[next]); }
  }));
  const open = [];
  addEventListener("beforeprint", () => all("details:not([open])").forEach((part) => { part.open = true; open.push(part); }));
  addEventListener("afterprint", () => open.splice(0).forEach((part) => { part.open = false; }));
})();
