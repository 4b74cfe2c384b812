/** Nothing older is spoken, neither as a server nor to one. */
export const LEAST_TLS = 'TLSv1.2';

/** Certificates towards a server as PEM, and the name that its own has to be for; null: by default. */
interface Certificates {
  readonly ca: string | null;
  readonly cert: string | null;
  readonly key: string | null;
  readonly server_name: string | null;
}

/** What a connection to a server is opened with: its certificate is always checked. */
export function clientTlsOptions(certificates: Certificates | null | undefined) {
  const { ca, cert, key, server_name: servername } = certificates ?? {};
  return {
    rejectUnauthorized: true,
    minVersion: LEAST_TLS,
    ...(ca ? { ca } : {}),
    ...(cert ? { cert } : {}),
    ...(key ? { key } : {}),
    ...(servername ? { servername } : {}),
  } as const;
}
