/**
 * A value that takes time to get, shown when it is there: the last one stays until the next arrives.
 */

export class Fresh<T> {
  #key = '';
  #wanted = '';
  #value: T | undefined;
  #failed: string | null = null;

  /** The value for a key, or what there is; asks for it when it is another than the last one asked for. */
  get(key: string, make: () => Promise<T>, arrived: () => void): T | undefined {
    if (this.#wanted !== key) {
      this.#wanted = key;
      this.#failed = null;
      make().then(
        (value) => {
          if (this.#wanted !== key) return;
          this.#key = key;
          this.#value = value;
          arrived();
        },
        (error: unknown) => {
          if (this.#wanted !== key) return;
          this.#failed = error instanceof Error ? error.message : String(error);
          this.#value = undefined;
          arrived();
        },
      );
    }
    return this.#value;
  }

  /** True when the value is the one last asked for. */
  get current(): boolean {
    return this.#key === this.#wanted;
  }

  get failed(): string | null {
    return this.#failed;
  }
}
