using System.Reflection;
using System.Runtime.Loader;

namespace Stacks.Pipeline;

/// <summary>
/// The assemblies of one plugin. The contracts come from the host whatever copies lie beside the plugin, so that both
/// mean the same types; everything else comes from the plugin's folder, else from the host's framework.
/// </summary>
internal sealed class PluginLoadContext(string assemblyPath) : AssemblyLoadContext(Path.GetFileNameWithoutExtension(assemblyPath))
{
    private static readonly string[] FromHost = ["Stacks.Abstractions", "Stacks.Imaging"];

    private readonly AssemblyDependencyResolver resolver = new(assemblyPath);

    protected override Assembly? Load(AssemblyName assemblyName)
    {
        if (FromHost.Contains(assemblyName.Name))
            return null;
        return resolver.ResolveAssemblyToPath(assemblyName) is { } path ? LoadFromAssemblyPath(path) : null;
    }

    protected override nint LoadUnmanagedDll(string unmanagedDllName) =>
        resolver.ResolveUnmanagedDllToPath(unmanagedDllName) is { } path ? LoadUnmanagedDllFromPath(path) : 0;
}
