FROM python:3.11-slim AS build
WORKDIR /src
COPY pyproject.toml README.md ./
COPY service service
COPY data data
COPY templates templates
RUN python -m venv /opt/blinkline && /opt/blinkline/bin/pip install --no-cache-dir '.[postgresql]' \
  && chown -R root:root /opt/blinkline && chmod -R u=rwX,go=rX /opt/blinkline

# Runs without root rights and writes to /data alone: start it with
# docker run --read-only --cap-drop ALL --security-opt no-new-privileges -p 8321:8321 blinkline
FROM python:3.11-slim
COPY --from=build /opt/blinkline /opt/blinkline
RUN useradd --system --no-create-home --shell /usr/sbin/nologin --uid 10001 blinkline && install -d -o 10001 -m 700 /data
USER 10001
# Mount a volume on /data to keep the register, or name a PostgreSQL database in BLINKLINE_DATABASE. From
# outside the container it answers once BLINKLINE_SIGN_IN is set.
ENV BLINKLINE_HOST=0.0.0.0 BLINKLINE_PORT=8321 BLINKLINE_DATA_DIR=/data PYTHONDONTWRITEBYTECODE=1
VOLUME /data
EXPOSE 8321
HEALTHCHECK --interval=30s --timeout=5s --start-period=20s \
  CMD ["/opt/blinkline/bin/python", "-c", "import urllib.request as r; r.urlopen('http://127.0.0.1:8321/health/ready', timeout=4)"]
CMD ["/opt/blinkline/bin/blinkline", "serve"]
