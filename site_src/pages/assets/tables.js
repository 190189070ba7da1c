/* Sorting and filtering of tables, copying of identifiers, the date on a print. No requests. */
(function () {
  "use strict";

  function key(row, column, numeric) {
    var cell = row.cells[column];
    if (!numeric) { return cell.textContent.trim().toLowerCase(); }
    var text = cell.getAttribute("data-v");
    return text === null || text === "" ? NaN : Number(text);
  }

  function compare(a, b, numeric) {
    if (!numeric) { return a.localeCompare(b, "en", { numeric: true }); }
    return a - b;
  }

  /* Empty places stay at the end whichever way the column is sorted. */
  function sort(table, column, numeric, direction) {
    var body = table.tBodies[0];
    var rows = Array.prototype.map.call(body.rows, function (row, position) {
      return [key(row, column, numeric), position, row];
    });
    rows.sort(function (a, b) {
      var none = numeric ? isNaN(a[0]) - isNaN(b[0]) : (a[0] === "") - (b[0] === "");
      return none || direction * compare(a[0], b[0], numeric) || a[1] - b[1];
    });
    var piece = document.createDocumentFragment();
    rows.forEach(function (row) { piece.appendChild(row[2]); });
    body.appendChild(piece);
  }

  function sortable(table) {
    var heads = Array.prototype.slice.call(table.tHead.rows[0].cells);
    heads.forEach(function (head, column) {
      var kind = head.getAttribute("data-sort");
      if (!kind) { return; }
      var button = document.createElement("button");
      button.type = "button";
      button.className = "sort";
      while (head.firstChild) { button.appendChild(head.firstChild); }
      head.appendChild(button);
      button.addEventListener("click", function () {
        var up = head.getAttribute("aria-sort") !== "ascending";
        heads.forEach(function (other) { other.removeAttribute("aria-sort"); });
        head.setAttribute("aria-sort", up ? "ascending" : "descending");
        sort(table, column, kind === "number", up ? 1 : -1);
      });
    });
  }

  function tools(bar) {
    var table = document.getElementById(bar.getAttribute("data-for"));
    if (!table) { return; }
    bar.hidden = false;
    var rows = Array.prototype.slice.call(table.tBodies[0].rows);
    var texts = rows.map(function (row) {
      return Array.prototype.slice.call(row.cells, 0, 3)
        .concat(table.classList.contains("findings") ? [row.cells[5]] : [])
        .map(function (cell) { return cell.textContent; }).join(" ").toLowerCase();
    });
    var filter = bar.querySelector(".table-filter");
    var count = bar.querySelector(".table-count");
    var noun = count.textContent.replace(/^\d+ /, "");
    filter.addEventListener("input", function () {
      var wanted = filter.value.trim().toLowerCase();
      var bare = wanted.replace(/-/g, "");
      var shown = 0;
      rows.forEach(function (row, i) {
        var fits = texts[i].indexOf(wanted) >= 0 || texts[i].replace(/-/g, "").indexOf(bare) >= 0;
        row.hidden = !fits;
        shown += fits ? 1 : 0;
      });
      count.textContent = (shown === rows.length ? "" : shown + " of ") + rows.length + " " + noun;
    });
    var box = bar.querySelector(".table-uncertainty");
    if (box) {
      box.addEventListener("change", function () {
        table.classList.toggle("without-u", !box.checked);
      });
    }
  }

  function copyButton(holder) {
    if (!navigator.clipboard) { return; }
    var button = document.createElement("button");
    button.type = "button";
    button.className = "copy-button";
    button.textContent = "Copy";
    button.setAttribute("aria-label", "Copy " + holder.textContent);
    button.addEventListener("click", function () {
      navigator.clipboard.writeText(holder.textContent).then(function () {
        button.textContent = "Copied";
        window.setTimeout(function () { button.textContent = "Copy"; }, 1500);
      });
    });
    holder.insertAdjacentElement("afterend", button);
  }

  function stamp() {
    var today = new Date();
    var text = [today.getFullYear(), today.getMonth() + 1, today.getDate()]
      .map(function (part) { return (part < 10 ? "0" : "") + part; }).join("-");
    Array.prototype.forEach.call(document.querySelectorAll(".print-date"), function (place) {
      place.textContent = text;
    });
  }

  function start() {
    Array.prototype.forEach.call(document.querySelectorAll("table.sortable"), sortable);
    Array.prototype.forEach.call(document.querySelectorAll(".table-tools"), tools);
    Array.prototype.forEach.call(document.querySelectorAll("[data-copy]"), copyButton);
    stamp();
    window.addEventListener("beforeprint", stamp);
  }

  if (document.readyState === "loading") {
    document.addEventListener("DOMContentLoaded", start);
  } else {
    start();
  }
})();
