/** A canvas kept at the size of its box and the screen's pixels, cleared and scaled for each draw. */
export class Surface {
  readonly context: CanvasRenderingContext2D;
  /** CSS pixels. */
  width = 0;
  height = 0;
  /** Grows with every change of size. */
  version = 0;
  private readonly observer: ResizeObserver;

  constructor(
    readonly canvas: HTMLCanvasElement,
    onResize: () => void,
  ) {
    const context = canvas.getContext('2d');
    if (!context) throw new Error('This browser has no 2D canvas.');
    this.context = context;
    this.observer = new ResizeObserver(() => {
      this.measure();
      onResize();
    });
    this.observer.observe(canvas);
    this.measure();
  }

  begin(): CanvasRenderingContext2D {
    const ratio = this.canvas.width / Math.max(1, this.width);
    this.context.setTransform(ratio, 0, 0, ratio, 0, 0);
    this.context.clearRect(0, 0, this.width, this.height);
    return this.context;
  }

  release(): void {
    this.observer.disconnect();
  }

  private measure(): void {
    const { clientWidth, clientHeight } = this.canvas;
    const ratio = Math.min(3, window.devicePixelRatio || 1);
    if (clientWidth === this.width && clientHeight === this.height) return;
    this.width = clientWidth;
    this.height = clientHeight;
    this.canvas.width = Math.max(1, Math.round(clientWidth * ratio));
    this.canvas.height = Math.max(1, Math.round(clientHeight * ratio));
    this.version++;
  }
}
