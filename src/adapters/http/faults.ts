/**
 * What a client can be told is wrong. Every answer that is not a success has the body
 * `{"error": {code, message, field, value, expected}}`; the codes are a closed list.
 */
export const FAULT_CODES = [
  'not_logged_in',
  'not_allowed',
  'other_origin',
  'wrong_value',
  'unknown_field',
  'unknown_unit',
  'unknown_series',
  'unknown_event',
  'wrong_state',
  'unknown_offers',
  'unusable_backup',
  'unknown_route',
  'unreadable_body',
  'not_acceptable',
  'no_estimate_yet',
  'nothing_stored',
  'estimate_stale',
  'too_many_requests',
  'too_many_streams',
  'page_not_built',
  'question_failed',
  'internal',
] as const;
export type FaultCode = (typeof FAULT_CODES)[number];

/** How often each has been answered since the start. */
export class FaultCounts {
  private readonly counts = new Map<FaultCode, number>(FAULT_CODES.map((code) => [code, 0]));

  add(code: FaultCode): void {
    this.counts.set(code, (this.counts.get(code) ?? 0) + 1);
  }

  all(): [FaultCode, number][] {
    return [...this.counts];
  }
}

export interface FaultBody {
  error: {
    code: FaultCode;
    message: string;
    /** Name of the field at fault, null where no single field is. */
    field: string | null;
    /** The value found. */
    value: unknown;
    /** What would have been right. */
    expected: string | null;
    /** Further faults of the same question. */
    others?: { field: string | null; value: unknown; expected: string | null }[];
  };
}

interface FaultDetail {
  field?: string;
  value?: unknown;
  expected?: string;
  others?: NonNullable<FaultBody['error']['others']>;
}

/** A wrong question, or one that cannot be answered now. Thrown by a route, answered as JSON. */
export class HttpFault extends Error {
  constructor(
    readonly statusCode: number,
    readonly code: FaultCode,
    message: string,
    readonly detail: FaultDetail = {},
  ) {
    super(message);
    this.name = 'HttpFault';
  }

  body(): FaultBody {
    const { field = null, value = null, expected = null, others } = this.detail;
    const error: FaultBody['error'] = {
      code: this.code,
      message: this.message,
      field,
      value,
      expected,
    };
    if (others !== undefined && others.length > 0) error.others = others;
    return { error };
  }
}

/** A value that is not what the field wants. */
export function wrongValue(field: string, value: unknown, expected: string): HttpFault {
  return new HttpFault(400, 'wrong_value', `${field} is ${show(value)}; expected ${expected}`, {
    field,
    value,
    expected,
  });
}

/** A unit that this site does not have: the answer names those it has. */
export function unknownUnit(unit: string, known: readonly string[], status: 400 | 404): HttpFault {
  const expected = known.length > 0 ? `one of ${known.join(', ')}` : 'no unit is configured';
  return new HttpFault(status, 'unknown_unit', `there is no unit ${show(unit)}; ${expected}`, {
    field: 'unit',
    value: unit,
    expected,
  });
}

/** A value as it is quoted in a message: JSON, cut to a line. */
export function show(value: unknown): string {
  const text = JSON.stringify(value) ?? 'missing';
  return text.length > 120 ? `${text.slice(0, 117)}...` : text;
}
