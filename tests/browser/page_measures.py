"""What is measured in a page: latency of a plot, overflow, contrast of text, labels that are cut."""

import statistics

# Pixels of the first picture below `selector`, whether ipympl's canvas or an image.
PIXELS = """
window.vxPixels = selector => {
    const picture = document.querySelector(selector + ' canvas, ' + selector + ' img');
    let canvas = picture;
    if (picture instanceof HTMLImageElement) {
        if (!picture.complete || !picture.naturalWidth) return null;
        canvas = document.createElement('canvas');
        canvas.width = picture.naturalWidth;
        canvas.height = picture.naturalHeight;
        canvas.getContext('2d').drawImage(picture, 0, 0);
    }
    const context = canvas.getContext('2d', { willReadFrequently: true });
    return new Uint8ClampedArray(context.getImageData(0, 0, canvas.width, canvas.height).data);
};
window.vxChanged = (before, after) => {
    if (before.length !== after.length) return before.length;
    let changed = 0;
    for (let i = 0; i < before.length; i += 4) {
        const colour = Math.abs(before[i + 1] - after[i + 1]) + Math.abs(before[i + 2] - after[i + 2]);
        if (Math.abs(before[i] - after[i]) + colour > 60) changed += 1;
    }
    return changed;
};
"""

# From the key that moves a slider to the first frame whose picture differs clearly.
STEP = """selector => new Promise((done, fail) => {
    const before = vxPixels(selector);
    let pressed = null;
    document.addEventListener('keydown', () => { pressed = performance.now(); }, { capture: true, once: true });
    const start = performance.now();
    (function look() {
        const now = performance.now();
        const after = pressed === null ? null : vxPixels(selector);
        const changed = after === null ? 0 : vxChanged(before, after);
        if (changed > 100) done({ latency: now - pressed, changed });
        else if (now - start > 5000) fail(new Error('the plot did not change in 5 s'));
        else requestAnimationFrame(look);
    })();
    window.vxArmed = true;
})"""

# The full drawing at rest must not pass for the answer to the next key.
STANDS_STILL = """selector => new Promise((done, fail) => {
    const start = performance.now();
    let [shown, since] = [vxPixels(selector), start];
    (function look() {
        const [now, after] = [performance.now(), vxPixels(selector)];
        if (shown === null || after === null || vxChanged(shown, after) > 0) [shown, since] = [after, now];
        if (now - since > 450) done();
        else if (now - start > 20000) fail(new Error('the plot does not come to rest'));
        else setTimeout(look, 50);
    })();
})"""

OVERFLOW = """() => {
    const panel = document.querySelector('.vx-panel');
    const right = panel.getBoundingClientRect().right;
    const seen = element => {
        const style = getComputedStyle(element);
        return style.visibility !== 'hidden' && style.display !== 'none' && element.getClientRects().length > 0;
    };
    const wide = [...panel.querySelectorAll('*')]
        .filter(e => seen(e) && !e.closest('.MathJax, mjx-container, .jupyter-matplotlib-toolbar'))
        .filter(e => e.getBoundingClientRect().width > 1 && e.getBoundingClientRect().right > right + 0.5)
        .map(e => `${e.tagName}.${e.className} ends ${Math.round(e.getBoundingClientRect().right - right)} px outside`);
    for (const box of [panel, ...panel.querySelectorAll('*')]) {
        if (['TEXTAREA', 'INPUT'].includes(box.tagName) || box.closest('.jupyter-matplotlib, mjx-container')) continue;
        if (seen(box) && getComputedStyle(box).overflowX !== 'visible' && box.scrollWidth > box.clientWidth + 1)
            wide.push(`${box.tagName}.${box.className} hides ${box.scrollWidth - box.clientWidth} px`);
    }
    const output = panel.closest('.jp-OutputArea-output, .jp-OutputArea-child');
    if (output && output.scrollWidth > output.clientWidth + 1) wide.push('the output scrolls sideways');
    return wide;
}"""

# A field whose number is longer than it is cut as well.
CUT_FIELDS = """() => [...document.querySelectorAll('.vx-panel input[type=text], .vx-panel select')]
    .filter(e => e.getClientRects().length && e.scrollWidth > e.clientWidth + 1)
    .map(e => `${e.value}: ${e.scrollWidth} px in ${e.clientWidth}`)"""

CUT_LABELS = """() => [...document.querySelectorAll('.vx-panel label, .vx-panel .widget-label, .vx-panel button')]
    .filter(e => e.getClientRects().length && getComputedStyle(e).visibility !== 'hidden')
    .filter(e => !e.closest('.jupyter-matplotlib'))
    .filter(e => e.scrollWidth > e.clientWidth + 1 || e.scrollHeight > e.clientHeight + 3)
    .map(e => `${e.textContent}: ${e.scrollWidth} x ${e.scrollHeight} px in ${e.clientWidth} x ${e.clientHeight}`)"""

# WCAG 2.1: relative luminance and contrast ratio; the ground is what the ancestors paint, the nearest on top.
CONTRAST = """() => {
    const parse = text => {
        const numbers = text.match(/[\\d.]+(e-?\\d+)?/g).map(Number);
        const scale = text.startsWith('color(') ? 255 : 1;
        return [...numbers.slice(0, 3).map(n => n * scale), numbers.length > 3 ? numbers[3] : 1];
    };
    const over = (top, below) => top.slice(0, 3).map((c, i) => c * top[3] + below[i] * (1 - top[3])).concat(1);
    const luminance = colour => {
        const [r, g, b] = colour.map(c => c / 255).map(c => c <= 0.03928 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4);
        return 0.2126 * r + 0.7152 * g + 0.0722 * b;
    };
    const ground = element => {
        const layers = [];
        for (let e = element; e; e = e.parentElement) layers.push(parse(getComputedStyle(e).backgroundColor));
        return layers.reverse().reduce((below, top) => over(top, below), [255, 255, 255, 1]);
    };
    const found = [];
    const look = (element, text, colour) => {
        const below = ground(element);
        let shown = parse(colour);
        for (let e = element; e; e = e.parentElement) shown[3] *= Number(getComputedStyle(e).opacity);
        const [dark, light] = [luminance(over(shown, below)), luminance(below)].sort((a, b) => a - b);
        found.push({ text: text.trim().slice(0, 60), ratio: (light + 0.05) / (dark + 0.05) });
    };
    const panel = document.querySelector('.vx-panel');
    const walker = document.createTreeWalker(panel, NodeFilter.SHOW_TEXT);
    for (let node = walker.nextNode(); node; node = walker.nextNode()) {
        const element = node.parentElement;
        if (!node.textContent.trim()) continue;
        if (element.closest('style, script, .jupyter-matplotlib, mjx-assistive-mml')) continue;
        if (!element.getClientRects().length || getComputedStyle(element).visibility === 'hidden') continue;
        look(element, node.textContent, getComputedStyle(element).color);
    }
    for (const field of panel.querySelectorAll('input, select, textarea')) {
        if (!field.getClientRects().length || field.type === 'file') continue;
        look(field, field.value, getComputedStyle(field).color);
        if (field.placeholder) look(field, field.placeholder, getComputedStyle(field, '::placeholder').color);
    }
    return found;
}"""


def slider(page, label: str):
    """Return the handle of the slider below the field with this label."""
    field = page.locator(".vx-field", has=page.locator(".widget-text .widget-label", has_text=label))
    return field.first.locator(".noUi-handle")


def measure_latency(page, handle, figure: str, *, steps: int = 10) -> list[float]:
    """Move a slider by the keyboard and return, per step, the milliseconds until the picture in `figure` changed."""
    page.evaluate("() => {" + PIXELS + "}")
    handle.focus()
    latencies = []
    for step in range(steps):
        page.evaluate(STANDS_STILL, figure)
        page.evaluate("step => { window.vxArmed = false; window.vxStep = (" + STEP + ")(step); }", figure)
        page.wait_for_function("() => window.vxArmed")
        page.keyboard.press("ArrowRight" if step % 2 == 0 else "PageUp")
        latencies.append(page.evaluate("() => window.vxStep")["latency"])
    return latencies


def tell_latency(capsys, name: str, latencies: list[float]) -> float:
    """Print the latencies even when the test passes, and return their median."""
    median = statistics.median(latencies)
    with capsys.disabled():
        print(f"\n{name}: {median:.0f} ms median of {len(latencies)} ({min(latencies):.0f} to {max(latencies):.0f} ms)")
    return median
