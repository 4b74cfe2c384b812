# Compilers stay in the first stage: only its results are taken over.
FROM node:20-bookworm-slim AS build
RUN apt-get update \
 && apt-get install -y --no-install-recommends python3 make g++ ca-certificates \
 && rm -rf /var/lib/apt/lists/*
WORKDIR /app
COPY package.json package-lock.json ./
RUN npm ci --no-audit --no-fund
COPY tsconfig.json ./
COPY tools tools
COPY src src
RUN npm run build && npm prune --omit=dev --no-audit --no-fund \
 && npm run --silent sbom > sbom.json

FROM node:20-bookworm-slim
# Memory of malloc and V8: less of it, see DEVELOPERS.md; the same in config/rockhour.service.
ENV NODE_ENV=production \
    MALLOC_ARENA_MAX=1 \
    MALLOC_MMAP_THRESHOLD_=65536 \
    MALLOC_TRIM_THRESHOLD_=131072 \
    NODE_OPTIONS=--max-semi-space-size=8 \
    ROCKHOUR_HEALTH_URL=http://127.0.0.1:8080/api/live
# A fixed number, so that a volume's owner can be set from outside.
RUN groupadd --gid 10001 rockhour \
 && useradd --uid 10001 --gid rockhour --home-dir /data --no-create-home --shell /usr/sbin/nologin rockhour \
 && mkdir -p /data /config /app/var \
 && chown rockhour:rockhour /data /app/var
COPY --from=build /app/node_modules /app/node_modules
COPY --from=build /app/dist /app/dist
COPY package.json /app/package.json
# Software bill of materials (CycloneDX) of what is in here.
COPY --from=build /app/sbom.json /app/sbom.json
COPY bin /app/bin
COPY config /app/config
RUN ln -s /app/bin/rockhour /usr/local/bin/rockhour
USER rockhour
WORKDIR /data
VOLUME ["/data"]
EXPOSE 8080 1883
STOPSIGNAL SIGTERM
# Healthy is a daemon that answers. That a database or a broker outside is down is in its answer,
# for people: to restart rockhour would not bring it back.
HEALTHCHECK --interval=30s --timeout=5s --start-period=60s --retries=3 \
  CMD ["node", "-e", "fetch(process.env.ROCKHOUR_HEALTH_URL).then((answer) => answer.json()).then((answer) => process.exit(answer.alive === true ? 0 : 1), () => process.exit(1))"]
ENTRYPOINT ["rockhour"]
CMD ["run", "--config", "/config/plant.yaml"]
