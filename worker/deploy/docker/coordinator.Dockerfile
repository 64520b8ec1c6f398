# The coordinator of one search. Build from the top of the repository:
#   docker build -f worker/deploy/docker/coordinator.Dockerfile -t skerry-coordinator .
# The final image holds no compiler and no package manager's cache, and runs as a user without rights.

FROM node:20-bookworm-slim AS build
# Only for SQLite, where its prebuilt binary cannot be fetched.
RUN apt-get update && apt-get install -y --no-install-recommends python3 make g++ && rm -rf /var/lib/apt/lists/*
WORKDIR /app
COPY . .
RUN npm ci && npm prune --omit=dev

FROM node:20-bookworm-slim
ENV NODE_ENV=production
WORKDIR /app
COPY --from=build /app/package.json ./
COPY --from=build /app/node_modules ./node_modules
COPY --from=build /app/dist ./dist
RUN ln -s /app/dist/coordinator/cli/skerry.js /usr/local/bin/skerry && mkdir -p /records /search && chown 10001:10001 /records
USER 10001:10001
WORKDIR /search
VOLUME /records
# Exit code 75 after SIGTERM: nothing is lost, the same command goes on.
STOPSIGNAL SIGTERM
ENTRYPOINT ["skerry"]
CMD ["run", "search.yaml", "--record", "/records/search"]
