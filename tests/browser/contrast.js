// The texts on a page that stand out too little from what is behind them (WCAG 2.2, 1.4.3).
() => {
  const channel = (value) => {
    const share = value / 255;
    return share <= 0.04045 ? share / 12.92 : ((share + 0.055) / 1.055) ** 2.4;
  };
  const read = (colour) => (colour.match(/[\d.]+/g) || []).map(Number);
  const luminance = ([r, g, b]) => 0.2126 * channel(r) + 0.7152 * channel(g) + 0.0722 * channel(b);
  const behind = (element) => {
    for (let place = element; place; place = place.parentElement) {
      const [r, g, b, a = 1] = read(getComputedStyle(place).backgroundColor);
      if (a > 0) return [r, g, b];
    }
    return [255, 255, 255];
  };
  const found = [];
  const walker = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
  while (walker.nextNode()) {
    const element = walker.currentNode.parentElement;
    const style = getComputedStyle(element);
    const box = element.getBoundingClientRect();
    const faded = element.closest(".shut, [disabled]");
    if (!walker.currentNode.textContent.trim() || faded || box.width < 2 || box.height < 2) continue;
    if (element.closest("svg") || style.visibility === "hidden") continue;
    const [light, dark] = [luminance(read(style.color)), luminance(behind(element))].sort((a, b) => b - a);
    const ratio = (light + 0.05) / (dark + 0.05);
    const size = parseFloat(style.fontSize);
    const large = size >= 24 || (size >= 18.66 && Number(style.fontWeight) >= 700);
    if (ratio < (large ? 3 : 4.5))
      found.push(`${walker.currentNode.textContent.trim().slice(0, 40)}: ${ratio.toFixed(2)}`);
  }
  return found;
}
