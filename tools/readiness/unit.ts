/**
 * A systemd unit that gives a live run what it needs and nothing else: an ordinary user, CAP_SYS_NICE, memory that may be
 * locked (systemd.exec(5), capabilities(7)).
 */
export function systemdUnit(where: { readonly folder: string; readonly node: string; readonly user: string }): string {
  return `# oilspring: a live run as a service. Copy to /etc/systemd/system/, name your bench file, then
#   sudo systemctl daemon-reload && sudo systemctl start oilspring
[Unit]
Description=oilspring, plant of a test bench
After=network.target

[Service]
Type=exec
User=${where.user}
WorkingDirectory=${where.folder}
ExecStart=${where.node} dist/tools/oilspring.js run configs/harbour-truck/bench.yaml
KillSignal=SIGTERM
TimeoutStopSec=20

# the right to real-time scheduling, for this process alone, and nothing else of root's
AmbientCapabilities=CAP_SYS_NICE
CapabilityBoundingSet=CAP_SYS_NICE
NoNewPrivileges=yes
LimitRTPRIO=80
LimitMEMLOCK=256M
RestrictRealtime=no
# a bench with CAN needs AF_CAN
RestrictAddressFamilies=AF_INET AF_INET6 AF_UNIX AF_CAN AF_NETLINK
ProtectSystem=strict
# the only place that is written: make it first
ReadWritePaths=${where.folder}/recordings
PrivateTmp=yes
ProtectHome=read-only
ProtectKernelTunables=yes
ProtectKernelModules=yes
ProtectKernelLogs=yes
ProtectControlGroups=yes
ProtectHostname=yes
RestrictNamespaces=yes
RestrictSUIDSGID=yes
LockPersonality=yes
SystemCallArchitectures=native
UMask=0027
# holds the deep idle states of the processors off
DeviceAllow=/dev/cpu_dma_latency rw

[Install]
WantedBy=multi-user.target
`;
}
