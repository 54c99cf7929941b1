(function () {
  "use strict";
  const value = function (row, place, number) {
    const cell = row.cells[place];
    const text = cell && cell.colSpan === 1 ? cell.textContent.trim() : "";
    if (text === "") { return null; }
    return number ? Number(text.replace("\u2212", "-")) : text;
  };
  const compared = function (one, other) {
    if (typeof one === "number") { return one - other; }
    return one < other ? -1 : Number(one > other);
  };
  const sort = function (table, heads, place) {
    const head = heads[place];
    const down = head.getAttribute("aria-sort") === "ascending";
    const number = head.classList.contains("number");
    const body = table.tBodies[0];
    const keyed = Array.from(body.rows).map(function (row) { return [value(row, place, number), row]; });
    keyed.sort(function (a, b) {
      if (a[0] === null || b[0] === null) { return Number(a[0] === null) - Number(b[0] === null); }
      return down ? compared(b[0], a[0]) : compared(a[0], b[0]);
    });
    keyed.forEach(function (pair) { body.append(pair[1]); });
    heads.forEach(function (each) { each.removeAttribute("aria-sort"); });
    head.setAttribute("aria-sort", down ? "descending" : "ascending");
  };
  document.querySelectorAll("table.sortable").forEach(function (table) {
    const heads = Array.from(table.tHead.rows[0].cells);
    heads.forEach(function (head, place) {
      const button = document.createElement("button");
      button.type = "button";
      button.append(...head.childNodes);
      head.append(button);
      button.addEventListener("click", function () { sort(table, heads, place); });
    });
    heads[0].setAttribute("aria-sort", "ascending");
  });
})();
