import { nothing } from 'lit';
import { Directive, directive, type ElementPart, type PartInfo, PartType } from 'lit/directive.js';

class Fraction extends Directive {
  constructor(part: PartInfo) {
    super(part);
    if (part.type !== PartType.ELEMENT) throw new Error('fraction belongs on an element');
  }

  override render(_value: number): typeof nothing {
    return nothing;
  }

  override update(part: ElementPart, [value]: [number]): typeof nothing {
    (part.element as HTMLElement).style.setProperty('--fraction', value.toFixed(4));
    return nothing;
  }
}

/**
 * Gives an element's style sheet a number 0 … 1 as `--fraction`. Through the object model, since the page's policy forbids
 * style attributes.
 */
export const fraction = directive(Fraction);
