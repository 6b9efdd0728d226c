// The names of the curves at their right ends: rows in curve order, each led to its end by a
// line. The frame of the plane beside it has fixed borders, so heights in it are known.

const GAP = 26
const narrow = window.matchMedia("(max-width: 760px)")
const NS = "http://www.w3.org/2000/svg"

export function render({model, el}) {
  const root = document.createElement("div")
  root.className = "names"
  el.appendChild(root)

  const fill = (element, {value, pending}) => {
    element.textContent = value
    if (pending) element.appendChild(document.createElement("i")).className = "pending"
    element.classList.toggle("none", value === "none")
  }
  const paint = () => {
    const {rows, heading, counts} = model
    root.innerHTML = `
      <svg aria-hidden="true"></svg>
      <div class="block"><p class="heading"></p><dl></dl></div>
      <div class="counts"></div>`
    root.querySelector(".heading").textContent = heading
    const list = root.querySelector("dl")
    for (const row of rows) {
      const item = document.createElement("div")
      item.className = `row ${row.key}`
      item.innerHTML = `<i class="sample"></i><dt></dt><dd></dd>`
      item.querySelector("dt").textContent = row.name
      fill(item.querySelector("dd"), row)
      list.appendChild(item)
    }
    const box = root.querySelector(".counts")
    for (const [i, [name, value]] of counts.entries()) {
      const line = document.createElement("p")
      line.className = i ? "row" : "heading"
      line.innerHTML = `<span></span><b></b>`
      line.firstChild.textContent = name
      line.lastChild.textContent = value
      box.appendChild(line)
    }
    arrange()
  }

  const arrange = () => {
    const height = el.getRootNode().host.clientHeight
    const svg = root.querySelector("svg")
    const block = root.querySelector(".block")
    const counts = root.querySelector(".counts")
    svg.replaceChildren()
    if (narrow.matches || height < 120) {
      block.style.top = counts.style.top = ""
      return
    }
    const inner = height - model.top - model.bottom
    const at = (fdp) => model.top + (1 - fdp) * inner
    const lines = [...root.querySelectorAll(".block .row")]
    const drawn = model.rows.map((row, i) => ({...row, line: lines[i]})).filter((r) => r.end !== null)
    if (!drawn.length) return
    const mean = drawn.reduce((sum, row) => sum + at(row.end), 0) / drawn.length
    const size = block.offsetHeight
    const first = drawn[0].line.offsetTop
    const want = mean - first - GAP * drawn.length / 2
    // The block stays inside; the counts take the larger free stretch.
    const top = Math.max(0, Math.min(want, height - size - 4))
    block.style.top = `${top}px`
    const below = height - top - size
    counts.style.top = below > counts.offsetHeight + 16
      ? `${Math.max(top + size + 14, height - model.bottom - counts.offsetHeight - 8)}px`
      : `${Math.max(0, Math.min(top - counts.offsetHeight - 14, 0.4 * top))}px`
    counts.hidden = below <= counts.offsetHeight + 16 && top < counts.offsetHeight + 14
    for (const row of drawn) {
      const y = top + row.line.offsetTop + row.line.offsetHeight / 2
      const path = document.createElementNS(NS, "path")
      path.setAttribute("d", `M-12,${at(row.end)} L2,${at(row.end)} L16,${y}`)
      path.setAttribute("class", row.key)
      svg.appendChild(path)
    }
  }
  // While the pointer is over a picture along TPP, the column tells the values there, as read off
  // the curves: two digits, where the third would not be certain.
  const point = (event) => {
    const at = event.detail
    root.classList.toggle("pointed", at !== null)
    const heading = root.querySelector(".block .heading")
    heading.textContent = at === null ? model.heading : `Lowest FDP here,\nat TPP ${at.tpp.toFixed(2)}`
    for (const [i, item] of [...root.querySelectorAll(".block .row")].entries()) {
      const row = model.rows[i]
      fill(item.querySelector("dd"), at === null ? row : {...row, ...read(at.values[row.key])})
    }
  }
  const read = (value) => {
    if (!Number.isFinite(value)) return {value: "none", pending: false}
    return {value: value > 0 && value < 0.005 ? "<0.01" : value.toFixed(2), pending: value >= 0.005}
  }
  window.addEventListener("sparsereach:pointer", point)
  model.on("remove", () => window.removeEventListener("sparsereach:pointer", point))

  const settle = new ResizeObserver(arrange)
  settle.observe(el.getRootNode().host)
  model.on(["rows", "heading", "counts"], paint)
  paint()
}
