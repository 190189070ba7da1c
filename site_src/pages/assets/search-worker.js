/* Beside the theme's search, in a worker or in a frame: one fault mended. The search library
   (lunr 2.3.9) tells the nodes of its index apart by "label and number, label and number …" without
   anything in between. Where labels are digits, as in CAS numbers and formulas, two different nodes
   can read the same, and a search fails. A comma keeps them apart. */
(() => {
  "use strict";

  if (self.importScripts) { importScripts(decodeURIComponent(self.location.hash.slice(1))); }
  self.lunr.TokenSet.prototype.toString = function () {
    const edges = Object.keys(this.edges).sort().map((label) => `${label}${this.edges[label].id},`);
    return (this.final ? "1" : "0") + edges.join("");
  };
})();
