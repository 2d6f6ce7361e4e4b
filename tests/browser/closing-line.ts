import type { FullResult, Reporter, TestCase, TestResult } from '@playwright/test/reporter';

/** Closes with one plain line of counts. */
export default class ClosingLine implements Reporter {
  readonly #last = new Map<string, TestResult['status']>();

  onTestEnd(test: TestCase, result: TestResult): void {
    this.#last.set(test.id, result.status);
  }

  onEnd(_result: FullResult): void {
    const all = [...this.#last.values()];
    const skipped = all.filter((status) => status === 'skipped').length;
    const passed = all.filter((status) => status === 'passed').length;
    console.log(`browser: ${passed} passed, ${all.length - passed - skipped} failed, ${skipped} skipped`);
  }

  printsToStdio(): boolean {
    return true;
  }
}
