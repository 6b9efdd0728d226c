// HTML written by Python. Whatever carries data-do speaks to Python when it is used: a button
// when clicked, a field or box when changed; its other data-* attributes go along.

export function render({model, el}) {
  const root = document.createElement("div")
  root.className = `sheet ${model.kind}`
  if (model.live) root.setAttribute("aria-live", "polite")
  el.appendChild(root)

  const paint = () => {
    const active = el.getRootNode().activeElement
    const key = active && root.contains(active) ? active.dataset.key : undefined
    root.innerHTML = model.html
    if (key) root.querySelector(`[data-key="${CSS.escape(key)}"]`)?.focus()
  }
  const speak = (target, more) => model.send_msg({...target.dataset, ...more})

  root.addEventListener("click", (event) => {
    const target = event.target.closest("button[data-do], a[data-do]")
    if (target) speak(target, {})
  })
  root.addEventListener("change", (event) => {
    const target = event.target.closest("input[data-do], textarea[data-do], select[data-do]")
    if (!target) return
    if (target.type === "file") return read(target)
    const box = target.type === "checkbox"
    speak(target, {value: box ? target.checked : target.value})
  })

  // A file is measured before it is sent: one too large would close the connection.
  const read = async (target) => {
    const file = target.files[0]
    if (!file) return
    const fits = file.size <= Number(target.dataset.limit)
    speak(target, {name: file.name, size: file.size, content: fits ? await base64(file) : ""})
    target.value = ""
  }

  const base64 = (file) => new Promise((resolve, reject) => {
    const reader = new FileReader()
    reader.onload = () => resolve(reader.result.split(",")[1] ?? "")
    reader.onerror = () => reject(reader.error)
    reader.readAsDataURL(file)
  })

  // What Python can ask of the browser beside showing HTML.
  const orders = {
    save({name, text}) {
      const blob = new Blob([text], {type: "application/json"})
      const link = document.createElement("a")
      link.href = URL.createObjectURL(blob)
      link.download = name
      link.click()
      setTimeout(() => URL.revokeObjectURL(link.href), 10000)
    },
    // The address follows the session, so that a reload or a copied link reopens it.
    address({query}) {
      history.replaceState(null, "", `?${query}${location.hash}`)
    },
    async copy({query}) {
      orders.address({query})
      const button = root.querySelector("[data-do=link]")
      const words = button.textContent
      try {
        await navigator.clipboard.writeText(location.href)
        button.textContent = "Copied"
      } catch {
        window.prompt("The link:", location.href)
      }
      setTimeout(() => { button.textContent = words }, 1600)
    },
    theme({name}) {
      document.documentElement.dataset.theme = name
    },
    dim({on}) {
      document.querySelector(".page.reach").classList.toggle("wrong", on)
    },
    count({kept}) {
      const badge = document.querySelector("#tab-shortlist b")
      badge.textContent = kept
      badge.hidden = kept === 0
    },
  }
  model.on("msg:custom", (event) => {
    const order = event.data ?? event
    orders[order.order](order)
  })
  model.on("html", paint)
  paint()
}
