using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Resolves a recipe, a stack and the machine to a <see cref="RunPlan"/>; everything that can be refused is refused here.</summary>
public sealed class RunPlanner
{
    private readonly Recipe recipe;
    private readonly PluginCatalogue catalogue;
    private readonly Resources resources;
    private readonly bool overwrite;
    private readonly bool salvage;
    private readonly IReadOnlyList<PlannedStep> steps;
    private readonly string digest;

    /// <summary>Checks what needs no stack: filters, parameters, output format, mask and defect files.</summary>
    /// <param name="recipe">The recipe.</param>
    /// <param name="catalogue">The installed plugins.</param>
    /// <param name="resources">Workers and memory.</param>
    /// <param name="overwrite">Replace outputs that do not match.</param>
    /// <param name="salvage">Take the whole frames of truncated stacks instead of refusing them.</param>
    /// <exception cref="RecipeException">The recipe does not fit the installed plugins.</exception>
    /// <exception cref="InputMissingException">A mask or defect file is not there.</exception>
    public RunPlanner(Recipe recipe, PluginCatalogue catalogue, Resources resources, bool overwrite, bool salvage = false)
    {
        this.recipe = recipe;
        this.catalogue = catalogue;
        this.resources = resources;
        this.overwrite = overwrite;
        this.salvage = salvage;
        steps = StepBinder.Bind(recipe, catalogue);
        OutputNaming.OutputFormat(recipe, catalogue);
        foreach (string? file in new[] { recipe.Input.Mask, recipe.Input.Defects })
        {
            if (file is not null)
                FormatFinder.Of(file, catalogue);
        }

        digest = RecipeDigest.Of(recipe, steps);
    }

    /// <summary>The plan for one input. The caller disposes it.</summary>
    /// <exception cref="StacksException">The input, the recipe for it, or the output's type is refused.</exception>
    public RunPlan Plan(NamedOutput item)
    {
        if (item.Fault is not null)
            throw item.Fault;
        CatalogueFormat input = item.Format!;
        CatalogueFormat output = item.OutputFormat!;
        RunPlan plan = new()
        {
            Reader = input.Format.Open(item.Input, new ReadOptions { Extensions = recipe.Input.Extensions, AllowTruncated = salvage }),
            Recipe = recipe,
            RecipeDigest = digest,
            Steps = steps,
            OutputPath = item.Output,
            OutputFormat = output.Format,
            FormatOrigins = [output.Origin, input.Origin],
            WriteMask = recipe.Output.Mask ?? steps.Any(s => s.Filter.Plugin.Kind == FilterKind.Selective),
            Workers = resources.Workers,
            FramesInFlight = 1,
            Overwrite = overwrite,
            OpenStack = path => FormatFinder.Of(path, catalogue).Format.Open(path, new ReadOptions()),
        };
        try
        {
            return Complete(plan);
        }
        catch
        {
            plan.Dispose();
            throw;
        }
    }

    private RunPlan Complete(RunPlan plan)
    {
        if (plan.Reader.OtherFiles.FirstOrDefault(file => RealPath.Of(file) == RealPath.Of(plan.OutputPath)) is { } other)
            throw new OutputException(plan.OutputPath, $"would overwrite {other}, a file of the input's stack", "give -o another name");
        if (plan.Reader.FrameCount == 0)
            throw new StackFormatException(plan.Reader.Path, "holds no science frame", "name its science extensions in [input] extensions, or another file");
        if (plan.OutputFormat.CannotCompress(recipe.Output.Compression) is { } fault)
            throw new RecipeException(recipe.Output.CompressionPlace.ToString(), $"{plan.OutputFormat.Id.ToUpperInvariant()} results cannot be compressed so: {fault}", "change [output] compression or format");
        IReadOnlyList<FrameKind> kinds = FrameKinds.Of(plan);
        FrameMasks masks = new(plan, CancellationToken.None);
        foreach (FrameKind kind in kinds)
        {
            masks.CheckShape(kind.FirstFrame, kind.Layout);
            if (plan.OutputFormat.CannotStore(kind.Output) is { } reason)
            {
                throw new RecipeException(recipe.Output.SamplesPlace.File is null ? recipe.Path : recipe.Output.SamplesPlace.ToString(),
                    $"{plan.OutputFormat.Id.ToUpperInvariant()} cannot store {kind.Output.Name()} samples: {reason}", "change [output] samples or format");
            }
        }

        MemoryNeed need = MemoryNeed.Of(kinds, plan.WriteMask);
        int wanted = Math.Min(plan.Reader.FrameCount, plan.Workers + 2);
        return plan with { Kinds = kinds, Memory = need, FramesInFlight = need.Fit(wanted, resources) };
    }
}
