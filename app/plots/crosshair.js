// Move the lines to the pointer's TPP, and tell the page the values of the curves there.
const {tpp, ...columns} = curves.data
const x = cb_obj.x
const inside = x >= 0 && x <= 1 && tpp.length > 0
for (const span of spans) span.setv({location: x, visible: inside}, {sync: false})
if (!inside) {
  window.dispatchEvent(new CustomEvent("sparsereach:pointer", {detail: null}))
  return
}
// A power limit stands twice in tpp: at it the pointer is on the side it came to.
let i = 0
while (i < tpp.length - 2 && tpp[i + 1] <= x) i += 1
const part = tpp[i + 1] > tpp[i] ? (x - tpp[i]) / (tpp[i + 1] - tpp[i]) : 0
const values = {}
for (const [key, column] of Object.entries(columns)) {
  values[key] = column[i] * (1 - part) + column[i + 1] * part
}
window.dispatchEvent(new CustomEvent("sparsereach:pointer", {detail: {tpp: x, values}}))
